// Package sampledata holds the files of the sample district, the Isle of Marram.
package sampledata
