// Package sun places the sun in the sky of a point on earth.
//
// Positions follow the low-precision theory of Meeus; against a full ephemeris it stays within
// 0.01 degrees of altitude for the years 2000 to 2049. Angles are degrees, latitude north positive,
// longitude east positive, azimuth clockwise from north; hour angles are zero at solar noon,
// negative before. Times are UTC. Vectors are in the local frame: X east, Y north, Z up.
//
// Left out: the difference between UT1 and UTC (under 0.9 s, 0.004 degrees of hour angle), the sun's
// ecliptic latitude (under 0.0004 degrees), planetary terms of the longitude, and terrain: the
// horizon is flat and at the height of the eye. All functions expect finite numbers.
package sun
