#!/bin/sh
# Makes everything in this folder again with GDAL 3.6.2 of Debian 12 (package gdal-bin); run it here.
set -eu
rm -f ./*.asc
awk 'BEGIN {
	print "ncols 31\nnrows 24\nxllcorner 500000\nyllcorner 5316300\ncellsize 25\nNODATA_value -9999"
	for (r = 0; r < 24; r++) for (c = 0; c < 31; c++) {
		z = 120 + 60*sin(c/4)*cos(r/5) + 9*sin(c*2.1 + r*1.3) + 0.7*c - 1.1*r
		if (c >= 24 && r >= 18) z = 80 # level ground
		if ((c == 6 && r == 9) || (c >= 12 && c <= 13 && r == 15)) z = -9999
		printf "%.2f%s", z, c < 30 ? " " : "\n"
	}
}' > heights.asc
made() { # name of the new file, mode of gdaldem, its options
	name="$1" mode="$2"; shift 2
	gdaldem "$mode" heights.asc made.tif -q "$@"
	gdal_translate -q -of AAIGrid -co SIGNIFICANT_DIGITS=9 made.tif "$name.asc"
}
made slope      slope -alg Horn
made aspect     aspect -alg Horn
made ruggedness TRI -alg Riley
made shade      hillshade -alg Horn -az 315 -alt 45
rm -f made.tif ./*.prj ./*.xml
