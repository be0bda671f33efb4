// Package gpkgin reads layers from any GeoPackage without ever writing to it.
//
// A GeoPackage (OGC 12-128r18) is an SQLite database that somebody else filled, so it is read with
// care: only tables that gpkg_contents lists can be asked for, the file is opened for reading alone,
// and what its schema may call is held to functions that do no harm. Triggers run on writing, so those
// of the file never run. Where nothing else stands beside the file it is opened as one that nobody
// changes, which also works on a medium that cannot be written. Edits that another program has left in
// a -wal file are read with it, under a notice; SQLite may then put a -shm file beside them.
//
// Coordinates come back as they stand in the file: east or longitude first, north or latitude second,
// which is the order that the standard asks for whatever the reference system.
//
// Left out: tiles and gridded coverages; curves and solids (the feature goes with a notice); heights
// and measures (dropped with a notice); columns of binary data (a notice names them); constraints and
// metadata. A column's unit is read where its description is "unit: " with the unit behind it, as
// gpkgout writes it. A view is computed whole before its first row is given, because only until then a
// context can stop it.
package gpkgin
