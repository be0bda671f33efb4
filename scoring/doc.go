// Package scoring holds the nouns of the comparison: values with their states, quantities, criteria,
// consequences, accounts.
//
// It computes from plain numbers and knows no map.
package scoring
