// Package plant is the stage of the plant options with their rules.
package plant
