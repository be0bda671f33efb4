#!/bin/sh
# Makes the workbook from the text, and what ogrinfo reads in it.
set -eu
cd "$(dirname "$0")"
rm -f readings.xlsx
ogr2ogr -f XLSX readings.xlsx readings.csv -nln readings
ogr2ogr -f XLSX -update readings.xlsx readings.csv -nln second -sql "SELECT name, count FROM readings WHERE count > 5"
ogrinfo -al -ro readings.xlsx > readings.txt
