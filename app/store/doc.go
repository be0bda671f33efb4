// Package store keeps a study in one file, an ordinary GeoPackage.
//
// The file follows OGC 12-128r18 (application_id GPKG, user_version 10300) in EPSG:4326. Every layer
// version with a geometry is a feature table, one without is an attributes table; the project's own
// tables begin with gt_ and are registered in gpkg_extensions. The file uses a rollback journal and
// full synchronous writes, so that it is whole after a kill at any moment and can lie on a network
// folder.
//
// Two programs may hold the same study open. A commit compares the old value of every change with
// what the file holds; where another program came first it fails with study.ErrBusy and changes
// nothing, so that no edit is lost unseen.
//
// Left out: spatial indexes (gpkg_rtree_index), because layers are read whole; dropping versions
// that nothing refers to, because the journal keeps every old value and so refers to all of them.
package store
