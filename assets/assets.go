// Package assets embeds what ships with the program: parameters, vocabulary, notices.
package assets

import "embed"

//go:embed params words NOTICE
var files embed.FS

// FS gives the shipped files: params/*.csv (cited tables), words/keys.csv and words/roles.csv
// (vocabulary), NOTICE (licences).
func FS() embed.FS { return files }
