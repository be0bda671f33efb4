// Package reckon evaluates the graph of quantities, once at central inputs or many times in trials.
package reckon
