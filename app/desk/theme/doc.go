// Package theme gives the window its typeface, colours, sizes in a light form like paper or a dark one.
package theme
