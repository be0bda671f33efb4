// Package citedtable parses the project's one CSV form for numbers that must carry a source.
package citedtable
