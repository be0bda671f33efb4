// Package energy computes the energy account of a plant from plain numbers.
//
// Energy given is electricity in MJ, energy spent is primary energy in MJ. Losses between plant and
// grid act on the numerator alone. Storage, backup plants, labour, finance and recycling credits are not
// counted. Ratios in primary equivalents and electric ratios are never mixed; each has its own name.
package energy
