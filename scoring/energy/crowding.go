package energy

import (
	"errors"
	"fmt"

	"groundtally/scoring/bounds"
)

// CrowdingPoint is one layout of the crowding curve, per hectare and over the life.
type CrowdingPoint struct {
	UnitsPerHa    float64
	EnergyMJPerHa float64 // electricity
	InputMJPerHa  float64 // primary energy, above 0
	StockMJPerHa  float64 // energy content of stocks lost, 0 or more; read only with stocks
	ConnectionKW  float64 // power of the connection per hectare, above 0; read only with a connection
}

// Crowding is a crowding curve with its marks in two currencies. Mixed net energy is electricity less primary
// energy, E − I; electric net energy is E − η_G·I. Both are given, and the axis must name which.
type Crowding struct {
	Points                     []CrowdingPoint
	Return, StockReturn        []float64 // E/I and E/(I + stocks), per layout; the latter nil without stocks
	Mixed, Electric            DensityOptima
	StockMixed, StockElectric  DensityOptima // with stocks counted as spent
	WithStocks, WithConnection bool
	PerKW                      CrowdingPerKW
}

// CrowdingPerKW is the same curve for each kilowatt of connection: where the grid is scarce and land is not.
type CrowdingPerKW struct {
	EnergyMJ, MixedMJ, ElectricMJ []float64 // per layout
	// The best densities by energy and by net energy, units per hectare, and what they give for a kilowatt.
	EnergyAt, MixedAt, ElectricAt       float64
	BestEnergy, BestMixed, BestElectric float64
	EnergyEnd, MixedEnd, ElectricEnd    bool // at an end of the sweep
}

// NewCrowding marks a crowding curve. Its optima are those of FindDensityOptima with the weight 1 (mixed) and η_G
// (electric) on what is spent. η_G gridEfficiency; withStocks and withConnection say whether the points carry
// those. The layouts stand in rising density, three or more.
func NewCrowding(points []CrowdingPoint, gridEfficiency float64, withStocks, withConnection bool) (*Crowding, error) {
	if err := efficiency(gridEfficiency); err != nil {
		return nil, err
	}
	c := &Crowding{Points: points, WithStocks: withStocks, WithConnection: withConnection}
	std, stock := make([]DensityPoint, len(points)), make([]DensityPoint, len(points))
	for i, p := range points {
		std[i] = DensityPoint{p.UnitsPerHa, p.EnergyMJPerHa, p.InputMJPerHa}
		stock[i] = std[i]
		if withStocks {
			if err := bounds.NonNegative("energy content of stocks", p.StockMJPerHa); err != nil {
				return nil, fmt.Errorf("layout %d: %w", i, err)
			}
			stock[i].InputMJPerHa += p.StockMJPerHa
		}
		if withConnection {
			if err := bounds.Positive("power of the connection", p.ConnectionKW); err != nil {
				return nil, fmt.Errorf("layout %d: %w", i, err)
			}
		}
	}
	var err [4]error
	c.Mixed, err[0] = FindDensityOptima(std, 1)
	c.Electric, err[1] = FindDensityOptima(std, gridEfficiency)
	if withStocks {
		c.StockMixed, err[2] = FindDensityOptima(stock, 1)
		c.StockElectric, err[3] = FindDensityOptima(stock, gridEfficiency)
	}
	if e := errors.Join(err[:]...); e != nil {
		return nil, e
	}
	n := make([]float64, len(points))
	for i := range points {
		n[i] = points[i].UnitsPerHa
		c.Return = append(c.Return, std[i].EnergyMJPerHa/std[i].InputMJPerHa)
		if withStocks {
			c.StockReturn = append(c.StockReturn, stock[i].EnergyMJPerHa/stock[i].InputMJPerHa)
		}
	}
	if withConnection {
		k := &c.PerKW
		for _, p := range points {
			k.EnergyMJ = append(k.EnergyMJ, p.EnergyMJPerHa/p.ConnectionKW)
			k.MixedMJ = append(k.MixedMJ, (p.EnergyMJPerHa-p.InputMJPerHa)/p.ConnectionKW)
			k.ElectricMJ = append(k.ElectricMJ, (p.EnergyMJPerHa-float64(gridEfficiency*p.InputMJPerHa))/p.ConnectionKW)
		}
		k.EnergyAt, k.BestEnergy, k.EnergyEnd = peak(n, k.EnergyMJ)
		k.MixedAt, k.BestMixed, k.MixedEnd = peak(n, k.MixedMJ)
		k.ElectricAt, k.BestElectric, k.ElectricEnd = peak(n, k.ElectricMJ)
	}
	return c, nil
}
