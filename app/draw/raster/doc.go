// Package raster paints scenes as pixels.
package raster
