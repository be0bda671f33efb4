package store

import (
	"context"
	"database/sql"
	"fmt"
)

// migrations bring a file from schema n to schema n+1. A migration that was released is never
// edited; a change of the schema is a new function at the end.
var migrations = []func(context.Context, *sql.Conn) error{
	schema1,
}

const (
	applicationID = 0x47504B47 // "GPKG"
	userVersion   = 10300
	extension     = "groundtally_study"
	definition    = "Tables of a Groundtally study: gt_ followed by a plain English name. See doc.go of app/store."
)

const wgs84 = `GEOGCS["WGS 84",DATUM["WGS_1984",SPHEROID["WGS 84",6378137,298.257223563,AUTHORITY["EPSG","7030"]],AUTHORITY["EPSG","6326"]],PRIMEM["Greenwich",0,AUTHORITY["EPSG","8901"]],UNIT["degree",0.0174532925199433,AUTHORITY["EPSG","9122"]],AUTHORITY["EPSG","4326"]]`

// schema1 makes the tables that a GeoPackage must have (OGC 12-128r18, annex C) and the study's own.
func schema1(ctx context.Context, c *sql.Conn) error {
	statements := []string{
		fmt.Sprintf(`PRAGMA application_id = %d`, applicationID),
		fmt.Sprintf(`PRAGMA user_version = %d`, userVersion),
		`CREATE TABLE gpkg_spatial_ref_sys (
			srs_name TEXT NOT NULL,
			srs_id INTEGER NOT NULL PRIMARY KEY,
			organization TEXT NOT NULL,
			organization_coordsys_id INTEGER NOT NULL,
			definition TEXT NOT NULL,
			description TEXT)`,
		`INSERT INTO gpkg_spatial_ref_sys VALUES
			('Undefined cartesian SRS', -1, 'NONE', -1, 'undefined', 'undefined cartesian coordinate reference system'),
			('Undefined geographic SRS', 0, 'NONE', 0, 'undefined', 'undefined geographic coordinate reference system'),
			('WGS 84 geodetic', 4326, 'EPSG', 4326, '` + wgs84 + `', 'longitude/latitude coordinates in decimal degrees on the WGS 84 spheroid')`,
		`CREATE TABLE gpkg_contents (
			table_name TEXT NOT NULL PRIMARY KEY,
			data_type TEXT NOT NULL,
			identifier TEXT UNIQUE,
			description TEXT DEFAULT '',
			last_change DATETIME NOT NULL DEFAULT (strftime('%Y-%m-%dT%H:%M:%fZ','now')),
			min_x DOUBLE, min_y DOUBLE, max_x DOUBLE, max_y DOUBLE,
			srs_id INTEGER,
			CONSTRAINT fk_gc_r_srs_id FOREIGN KEY (srs_id) REFERENCES gpkg_spatial_ref_sys(srs_id))`,
		`CREATE TABLE gpkg_geometry_columns (
			table_name TEXT NOT NULL,
			column_name TEXT NOT NULL,
			geometry_type_name TEXT NOT NULL,
			srs_id INTEGER NOT NULL,
			z TINYINT NOT NULL,
			m TINYINT NOT NULL,
			CONSTRAINT pk_geom_cols PRIMARY KEY (table_name, column_name),
			CONSTRAINT uk_gc_table_name UNIQUE (table_name),
			CONSTRAINT fk_gc_tn FOREIGN KEY (table_name) REFERENCES gpkg_contents(table_name),
			CONSTRAINT fk_gc_srs FOREIGN KEY (srs_id) REFERENCES gpkg_spatial_ref_sys(srs_id))`,
		`CREATE TABLE gpkg_extensions (
			table_name TEXT,
			column_name TEXT,
			extension_name TEXT NOT NULL,
			definition TEXT NOT NULL,
			scope TEXT NOT NULL,
			CONSTRAINT ge_tce UNIQUE (table_name, column_name, extension_name))`,

		`CREATE TABLE gt_schema (id INTEGER NOT NULL PRIMARY KEY CHECK (id = 1), version INTEGER NOT NULL)`,
		`INSERT INTO gt_schema VALUES (1, 0)`,
		`CREATE TABLE gt_record (
			kind TEXT NOT NULL, key TEXT NOT NULL, value TEXT NOT NULL,
			PRIMARY KEY (kind, key)) WITHOUT ROWID`,
		`CREATE TABLE gt_journal (
			seq INTEGER NOT NULL PRIMARY KEY,
			at TEXT NOT NULL, who TEXT NOT NULL, verb TEXT NOT NULL, reason TEXT NOT NULL,
			of INTEGER NOT NULL)`,
		`CREATE TABLE gt_change (
			seq INTEGER NOT NULL REFERENCES gt_journal(seq),
			pos INTEGER NOT NULL,
			kind TEXT NOT NULL, key TEXT NOT NULL, old TEXT, new TEXT,
			PRIMARY KEY (seq, pos)) WITHOUT ROWID`,
		`CREATE TABLE gt_frozen (
			name TEXT NOT NULL PRIMARY KEY,
			at TEXT NOT NULL, seq INTEGER NOT NULL, code TEXT NOT NULL)`,
		`CREATE TABLE gt_frozen_record (
			name TEXT NOT NULL REFERENCES gt_frozen(name),
			pos INTEGER NOT NULL,
			kind TEXT NOT NULL, key TEXT NOT NULL, value TEXT NOT NULL,
			PRIMARY KEY (name, pos)) WITHOUT ROWID`,
		`CREATE TABLE gt_blob (
			digest TEXT NOT NULL PRIMARY KEY,
			media TEXT NOT NULL, data BLOB NOT NULL)`,
		`CREATE TABLE gt_layer (
			digest TEXT NOT NULL PRIMARY KEY,
			table_name TEXT NOT NULL UNIQUE REFERENCES gpkg_contents(table_name),
			name TEXT NOT NULL,
			columns TEXT NOT NULL)`,
		`CREATE TABLE gt_value_kind (
			table_name TEXT NOT NULL, fid INTEGER NOT NULL, pos INTEGER NOT NULL, kind INTEGER NOT NULL,
			PRIMARY KEY (table_name, fid, pos)) WITHOUT ROWID`,
		`CREATE TABLE gt_result (
			step TEXT NOT NULL, digest TEXT NOT NULL, data BLOB NOT NULL,
			PRIMARY KEY (step, digest))`,
		// An attributes table in the contents makes other programs list the contents only, so that
		// the tables behind it do not appear among a study's layers.
		`INSERT INTO gpkg_contents (table_name, data_type, identifier, description, last_change)
			VALUES ('gt_journal', 'attributes', 'Journal of the study', 'What was changed, when, by whom and why', '1970-01-01T00:00:00.000Z')`,
	}
	for _, s := range statements {
		if _, err := c.ExecContext(ctx, s); err != nil {
			return err
		}
	}
	// The scope is write-only: a program that does not know the tables reads every layer right, while
	// one that writes may leave a layer's digest behind.
	for _, t := range []string{"gt_schema", "gt_record", "gt_journal", "gt_change", "gt_frozen", "gt_frozen_record",
		"gt_blob", "gt_layer", "gt_value_kind", "gt_result"} {
		if _, err := c.ExecContext(ctx, `INSERT INTO gpkg_extensions VALUES (?, NULL, ?, ?, 'write-only')`,
			t, extension, definition); err != nil {
			return err
		}
	}
	return nil
}
