// Package accounts is the stage of the consequence table.
package accounts
