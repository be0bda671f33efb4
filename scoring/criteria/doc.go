// Package criteria is the list of consequence keys with their words, anchors and families.
package criteria
