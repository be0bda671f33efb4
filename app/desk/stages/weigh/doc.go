// Package weigh is the stage of the window in which voices give weights that put the candidates in order.
package weigh
