// Package manifest describes the files of a sample district.
package manifest
