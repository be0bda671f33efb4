// Package geotiff reads grids of numbers from TIFF files that say where they lie.
//
// Read are classic and big files of either byte order, strips and tiles, without compression, with LZW
// or with Deflate, predictors 1 to 3, whole numbers of 8, 16 and 32 bits and floating point of 32 and
// 64. The first band of the first full image is taken. A block that the file leaves out is missing,
// also where the file names no value for missing ones; other programs then take it as zero.
//
// Left out: other compressions, turned or mirrored grids, grids placed by control points, masks,
// overviews, numbers of other depths. Each is refused or noticed by name.
package geotiff
