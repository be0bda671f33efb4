//go:build !linux

package store

import "testing"

// asOrdinaryUser does nothing: tests run as an ordinary user here, who is subject to permissions.
func asOrdinaryUser(*testing.T, string) {}
