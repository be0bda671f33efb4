// Package appendix writes what leaves the program: a page that shows and unfolds everything found.
package appendix
