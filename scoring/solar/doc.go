// Package solar estimates the yearly energy of photovoltaic rows from sunlight by month or by hour.
//
// NewClimate spreads monthly sums over representative hours, NewWeather lays a file of hours on whole years;
// Climate.Yield puts a plant into that light; Year does both for months. Every step from the light on the panel plane to the energy at the plant's
// terminals is logged as one link of a chain, so that a result can be unfolded. All functions are
// deterministic: the day types of a month are quantiles of a published distribution, no random
// numbers are drawn.
//
// Conventions: latitude north positive, longitude east positive, azimuth clockwise from north, tilt 0
// flat to 90 vertical; irradiance W/m2, energy kWh/m2 or kWh per kWp of direct-current rating under
// test conditions (1000 W/m2, 25 degrees C). Shares are fractions of 1. The southern hemisphere needs
// no change of sign.
//
// Left out: random hourly series, snow beyond a monthly loss given by the user, spectral effects, light
// reflected between rows, the effect of slope on diffuse light between rows, clipping inside the time steps
// (which adds 0.3 to 1 % of loss where the ratio of panel to inverter power exceeds 1.3), shade of posts on crops, panels that let light
// through, and shading by trees or buildings.
package solar
