// Package run carries a study through its steps: ground, fit, connection, facts, consequences, order.
package run
