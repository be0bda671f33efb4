// Package files opens what the user names for reading or for writing.
//
// Opening tells the kind of file by its first bytes and refuses, in plain words, what no reader can
// use. Writing is atomic: a file is either wholly the new one or still the old one.
package files
