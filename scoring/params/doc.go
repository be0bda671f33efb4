// Package params holds the cited, dated factors that the accounts draw their numbers from.
//
// It reads parsed tables or a given file system; it embeds nothing. Draws are keyed by a hash of what
// is drawn, so they do not depend on the order or the number of workers.
package params
