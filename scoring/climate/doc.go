// Package climate computes the greenhouse gas account of a plant from plain numbers.
//
// What a plant displaces elsewhere is a scenario under a grid factor that the user enters, not a fact.
package climate
