// Package chart draws comparisons of candidates as scenes.
package chart
