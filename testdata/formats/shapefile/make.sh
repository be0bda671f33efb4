#!/bin/sh
# Makes the shapefiles from the texts in source, and what ogrinfo reads in them.
set -eu
cd "$(dirname "$0")"
rm -f ./*.shp ./*.shx ./*.dbf ./*.prj ./*.cpg ./*.txt
make() { # name, source, coordinate system, further options
	name=$1 source=$2 crs=$3
	shift 3
	ogr2ogr -f "ESRI Shapefile" -lco DBF_DATE_LAST_UPDATE=2026-01-01 -a_srs "$crs" "$@" "$name.shp" "source/$source" -nln "$name"
}
make points points.geojson EPSG:4326
make multipoints multipoints.geojson EPSG:4326
make lines lines.geojson EPSG:25832
make areas areas.geojson EPSG:2056
for kind in heights heights_lines heights_points heights_multipoints measures_points measures_lines measures_areas measures_multipoints both_points both_lines both_areas; do
	case $kind in
	heights) type=POLYGONZ ;; heights_lines) type=ARCZ ;; heights_points) type=POINTZ ;; heights_multipoints) type=MULTIPOINTZ ;;
	measures_points) type=POINTM ;; measures_lines) type=ARCM ;; measures_areas) type=POLYGONM ;; measures_multipoints) type=MULTIPOINTM ;;
	both_points) type=POINTZM ;; both_lines) type=ARCZM ;; both_areas) type=POLYGONZM ;;
	esac
	make "$kind" "$kind.csv" EPSG:25832 -lco SHPT="$type" -oo GEOM_POSSIBLE_NAMES=WKT -oo KEEP_GEOM_COLUMNS=NO
done
make words_utf8 words.geojson EPSG:4326 -lco ENCODING=UTF-8
make words_1252 words.geojson EPSG:4326 -lco ENCODING=CP1252
make words_850 words.geojson EPSG:4326 -lco ENCODING=CP850
make words_latin1 words.geojson EPSG:4326 -lco ENCODING=ISO-8859-1
make words_ldid words.geojson EPSG:4326
# An edited set: a row is marked as deleted, a line has grown, so its old record is a gap.
make edited lines.geojson EPSG:25832
ogr2ogr -f "ESRI Shapefile" -append -nln edited edited.shp source/lines.geojson
ogrinfo -q -oo AUTO_REPACK=NO -oo DBF_DATE_LAST_UPDATE=2026-01-01 edited.shp -dialect SQLite -sql "UPDATE edited SET geometry = ST_GeomFromText('LINESTRING (1 2,3 4,5 6,7 8,9 10,11 12,13 14,15 16)') WHERE name = 'road' AND rowid = 0"
ogrinfo -q -oo AUTO_REPACK=NO -oo DBF_DATE_LAST_UPDATE=2026-01-01 edited.shp -dialect SQLite -sql "DELETE FROM edited WHERE rowid = 2"
for f in *.shp; do
	ogrinfo -al -ro -oo AUTO_REPACK=NO "$f" > "${f%.shp}.txt"
done
