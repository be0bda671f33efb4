// Package grid screens how a plant could be connected to the electricity network.
//
// It sorts candidates; it never says that a connection may be had. Only the network operator's study can
// offer a connection, its point, date, limit and charge. Harmonics, flicker, protection, stability and
// islanding are not looked at, nor is the thermal model of IEC 60287: ratings are tables times a derating.
//
// Sign rule: power is positive when the plant exports; reactive power is positive when the plant injects
// it (which raises the voltage) and negative when it absorbs it.
package grid
