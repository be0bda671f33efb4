#!/bin/bash
# Makes the rows of crs.csv that rest on GeographicLib (Planimeter, GeodSolve) or on PROJ (proj).
# Run with GeographicLib 2.1.2 and PROJ 9.1.1 on the path; prints CSV rows on standard output.
#
# Every polygon is the ring of n positions lon + dlon*cos(2 pi i/n), lat + dlat*sin(2 pi i/n).
set -eu
export LC_ALL=C
geo="GeographicLib 2.1.2"
n=0
area() { # centre lon, lat; offset lon, lat of the polygon; dlon dlat n tolerance
	n=$((n + 1))
	v=$(awk -v o="$3" -v a="$4" -v d="$5" -v e="$6" -v n="$7" 'BEGIN{pi=atan2(0,-1);for(i=0;i<n;i++)printf "%.14f %.14f\n",a+e*sin(2*pi*i/n),o+d*cos(2*pi*i/n)}' | Planimeter -p 12 | awk '{print $3}')
	echo "area-$n,geodesic_area_m2,lon0=$1;lat0=$2;lon=$3;lat=$4;dlon=$5;dlat=$6;n=$7,$v,$8 rel,$geo Planimeter,derived"
}
dist() { # centre lon, lat; two positions
	n=$((n + 1))
	v=$(echo "$4 $3 $6 $5" | GeodSolve -i -p 9 | awk '{print $3}')
	echo "dist-$n,geodesic_distance_m,lon0=$1;lat0=$2;lon1=$3;lat1=$4;lon2=$5;lat2=$6,$v,$7 rel,$geo GeodSolve,derived"
}
azimuth() { # centre lon, lat; position; true azimuth: the position 100 m along the geodesic
	n=$((n + 1))
	read -r la lo _ <<<"$(echo "$4 $3 $5 100" | GeodSolve -p 9)"
	echo "azi-$n,true_azimuth_deg,lon0=$1;lat0=$2;lon=$3;lat=$4;lon2=$lo;lat2=$la,$5,0.01,$geo GeodSolve,derived"
}
conv() { # centre lon, lat; position
	n=$((n + 1))
	v=$(echo "$3 $4" | proj +proj=laea +lat_0="$2" +lon_0="$1" +ellps=WGS84 -V | sed -n 's/^Convergence.*\[ *\(.*\) *\]/\1/p')
	echo "conv-$n,convergence_deg,lon0=$1;lat0=$2;lon=$3;lat=$4,$v,1e-6,PROJ 9.1.1 proj -V,derived"
}
laea() { # centre lon, lat; position
	n=$((n + 1))
	read -r x y <<<"$(echo "$3 $4" | proj -f %.9f +proj=laea +lat_0="$2" +lon_0="$1" +ellps=WGS84)"
	echo "laea-$n,frame_x_m,lon0=$1;lat0=$2;lon=$3;lat=$4,$x,1e-6,PROJ 9.1.1 proj +proj=laea,derived"
	echo "laea-${n}y,frame_y_m,lon0=$1;lat0=$2;lon=$3;lat=$4,$y,1e-6,PROJ 9.1.1 proj +proj=laea,derived"
}
for c in "9 48" "-4.5 56.5" "100.1 0.5" "25 70" "151 -35" "-70 -52.5"; do
	set -- $c
	s=$(awk -v l="$2" 'BEGIN{pi=atan2(0,-1);printf "%.6f",1/cos(l*pi/180)}')
	at() { awk -v l="$1" -v d="$2" -v s="$s" 'BEGIN{printf "%.6f",l+d/111.32*s}'; }
	up() { awk -v l="$1" -v d="$2" 'BEGIN{printf "%.6f",l+d/111.2}'; }
	wide() { awk -v d="$1" -v s="$s" 'BEGIN{printf "%.6f",d/111.32*s}'; }
	high() { awk -v d="$1" 'BEGIN{printf "%.6f",d/111.2}'; }
	# a parcel of about 50 ha in the middle, at the east edge and at the corner of a district 60 km wide
	area "$1" "$2" "$1" "$2" "$(wide 0.4)" "$(high 0.4)" 24 1e-6
	area "$1" "$2" "$(at "$1" 30)" "$2" "$(wide 0.4)" "$(high 0.4)" 24 1e-6
	area "$1" "$2" "$(at "$1" -30)" "$(up "$2" 30)" "$(wide 0.4)" "$(high 0.4)" 24 1e-6
	# the whole district
	area "$1" "$2" "$1" "$2" "$(wide 30)" "$(high 30)" 1440 1e-6
	# lengths: across the district, along its edge, a setback at its corner
	dist "$1" "$2" "$(at "$1" -30)" "$2" "$(at "$1" 30)" "$2" 1e-4
	dist "$1" "$2" "$(at "$1" 30)" "$(up "$2" -30)" "$(at "$1" 30)" "$(up "$2" 30)" 1e-4
	dist "$1" "$2" "$(at "$1" 30)" "$(up "$2" 30)" "$(at "$1" 30.5)" "$(up "$2" 30.2)" 1e-4
	azimuth "$1" "$2" "$(at "$1" 30)" "$(up "$2" 30)" 0
	azimuth "$1" "$2" "$(at "$1" 30)" "$(up "$2" 30)" 90
	azimuth "$1" "$2" "$(at "$1" -30)" "$(up "$2" 30)" 215
	conv "$1" "$2" "$(at "$1" 30)" "$(up "$2" 30)"
	conv "$1" "$2" "$(at "$1" -100)" "$(up "$2" 100)"
	laea "$1" "$2" "$(at "$1" 30)" "$(up "$2" -30)"
	laea "$1" "$2" "$(at "$1" -150)" "$(up "$2" 200)"
done
# across the antimeridian, far north
laea 179.8 -17 -179.7 -17.3
laea 10 84.9 25 85.9
