// Package fit places machines that keep an elliptical distance from each other in a buildable area.
//
// It knows no energy: a Gain passed by the caller judges layouts, without one the most machines win. There
// is no randomness; the same input gives the same positions.
package fit
