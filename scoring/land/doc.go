// Package land computes the land account of a plant from plain numbers.
//
// Stocks of carbon drawn down stand beside yields forgone; a flow is never added to a stock.
//
// Losses are positive and gains stand apart, never netted. Measured areas come from the caller.
package land
