// Package units holds every unit conversion of the program, once.
package units

// Fixed conversions. The typical year of the program has 8,760 hours.
const (
	HoursPerYear      = 8760.0
	SecondsPerHour    = 3600.0
	SecondsPerYear    = HoursPerYear * SecondsPerHour // 3.1536e7
	MJPerKWh          = 3.6
	MJPerMWh          = 3600.0
	MJPerGWh          = 3.6e6
	MJPerTJ           = 1e6
	MJPerGJ           = 1e3
	KWhPerMWh         = 1e3
	MWhPerGWh         = 1e3
	WPerKW            = 1e3
	KWPerMW           = 1e3
	M2PerHa           = 1e4
	MPerKm            = 1e3
	KgPerT            = 1e3
	GPerKg            = 1e3
	CO2PerC           = 44.0 / 12.0 // mass ratio of carbon dioxide to carbon
	ZeroCelsiusK      = 273.15
	HaPerAcre         = 0.40468564224 // international acre
	KmPerMile         = 1.609344
	JPerCal           = 4.184 // thermochemical calorie
	MinutesPerHour    = 60.0
	DegreesPerCircle  = 360.0
	KmPerHourPerMPerS = 3.6    // kilometres an hour in one metre a second
	MPerFoot          = 0.3048 // international foot of 1959
)
