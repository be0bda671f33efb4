package gpkgout

import "fmt"

const (
	rtreeDefinition  = "http://www.geopackage.org/spec120/#extension_rtree"
	schemaDefinition = "http://www.geopackage.org/spec121/#extension_schema"
)

const wgs84 = `GEOGCS["WGS 84",DATUM["WGS_1984",SPHEROID["WGS 84",6378137,298.257223563,AUTHORITY["EPSG","7030"]],AUTHORITY["EPSG","6326"]],PRIMEM["Greenwich",0,AUTHORITY["EPSG","8901"]],UNIT["degree",0.0174532925199433,AUTHORITY["EPSG","9122"]],AUTHORITY["EPSG","4326"]]`

// required makes what every GeoPackage must have (OGC 12-128r18, annex C).
var required = []string{
	`PRAGMA application_id = 0x47504B47`, // "GPKG"
	`PRAGMA user_version = 10300`,
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
}

// schemaExtension makes the tables that describe columns (clause F.9).
var schemaExtension = []string{
	`CREATE TABLE gpkg_data_columns (
		table_name TEXT NOT NULL,
		column_name TEXT NOT NULL,
		name TEXT,
		title TEXT,
		description TEXT,
		mime_type TEXT,
		constraint_name TEXT,
		CONSTRAINT pk_gdc PRIMARY KEY (table_name, column_name),
		CONSTRAINT gdc_tn UNIQUE (table_name, name))`,
	`CREATE TABLE gpkg_data_column_constraints (
		constraint_name TEXT NOT NULL,
		constraint_type TEXT NOT NULL,
		value TEXT,
		min NUMERIC,
		min_is_inclusive BOOLEAN,
		max NUMERIC,
		max_is_inclusive BOOLEAN,
		description TEXT,
		CONSTRAINT gdcc_ntv UNIQUE (constraint_name, constraint_type, value))`,
	`INSERT INTO gpkg_extensions VALUES
		('gpkg_data_columns', NULL, 'gpkg_schema', '` + schemaDefinition + `', 'read-write'),
		('gpkg_data_column_constraints', NULL, 'gpkg_schema', '` + schemaDefinition + `', 'read-write')`,
}

// triggers keep the index right while a program with the ST_ functions edits the table, in the words
// of edition 1.3 of the standard.
func triggers(t table) []string {
	table, index, fid, geom := quote(t.name), quote(t.rtree()), quote(t.fid), quote(t.geom)
	there := fmt.Sprintf(`(NEW.%[1]s NOTNULL AND NOT ST_IsEmpty(NEW.%[1]s))`, geom)
	gone := fmt.Sprintf(`(NEW.%[1]s ISNULL OR ST_IsEmpty(NEW.%[1]s))`, geom)
	put := fmt.Sprintf(`INSERT OR REPLACE INTO %[1]s VALUES (NEW.%[2]s, ST_MinX(NEW.%[3]s), ST_MaxX(NEW.%[3]s), ST_MinY(NEW.%[3]s), ST_MaxY(NEW.%[3]s));`, index, fid, geom)
	take := fmt.Sprintf(`DELETE FROM %s WHERE id = OLD.%s;`, index, fid)
	same, moved := fmt.Sprintf(`OLD.%[1]s = NEW.%[1]s`, fid), fmt.Sprintf(`OLD.%[1]s != NEW.%[1]s`, fid)
	trigger := func(name, event, when, body string) string {
		return fmt.Sprintf(`CREATE TRIGGER %s AFTER %s ON %s WHEN %s BEGIN %s END`, quote(t.rtree()+"_"+name), event, table, when, body)
	}
	return []string{
		trigger("insert", "INSERT", there, put),
		trigger("update1", "UPDATE OF "+geom, same+" AND "+there, put),
		trigger("update2", "UPDATE OF "+geom, same+" AND "+gone, take),
		trigger("update3", "UPDATE", moved+" AND "+there, take+" "+put),
		trigger("update4", "UPDATE", moved+" AND "+gone, fmt.Sprintf(`DELETE FROM %s WHERE id IN (OLD.%s, NEW.%s);`, index, fid, fid)),
		trigger("delete", "DELETE", fmt.Sprintf(`OLD.%s NOTNULL`, geom), take),
	}
}
