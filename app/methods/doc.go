// Package methods tells by which formulas the three accounts are reckoned, and what of them the literature disputes.
package methods
