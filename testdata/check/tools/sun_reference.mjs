// Makes testdata/check/sun_positions.csv with the npm package astronomy-engine 2.1.19 (MIT licence):
//   npm install astronomy-engine@2.1.19 && node sun_reference.mjs > sun_positions.csv
// Instants and places are drawn by a fixed generator over 2000 to 2049; angles are topocentric, of the date,
// without refraction.
import * as A from 'astronomy-engine';

let state = 20260501n;
function random() { // 63-bit linear congruential generator of Knuth's MMIX
  state = (state * 6364136223846793005n + 1442695040888963407n) & ((1n << 64n) - 1n);
  return Number(state >> 11n) / 2 ** 53;
}

const from = Date.UTC(2000, 0, 1), to = Date.UTC(2050, 0, 1);
console.log('# Sun positions by the npm package astronomy-engine 2.1.19, see tools/sun_reference.mjs.');
console.log('time_utc,lat_deg,lon_deg,right_ascension_deg,declination_deg,elevation_deg,azimuth_deg,distance_au');
for (let i = 0; i < 400; i++) {
  const t = new Date(Math.floor((from + random() * (to - from)) / 1000) * 1000);
  const lat = Math.round((random() * 178 - 89) * 1e4) / 1e4, lon = Math.round((random() * 360 - 180) * 1e4) / 1e4;
  const time = A.MakeTime(t);
  const centre = A.EquatorFromVector(A.RotateVector(A.Rotation_EQJ_EQD(time), A.GeoVector(A.Body.Sun, time, true)));
  const observer = new A.Observer(lat, lon, 0);
  const seen = A.Equator(A.Body.Sun, time, observer, true, true);
  const h = A.Horizon(time, observer, seen.ra, seen.dec, undefined);
  console.log([t.toISOString().replace('.000', ''), lat, lon, (centre.ra * 15).toFixed(5), centre.dec.toFixed(5), h.altitude.toFixed(5), h.azimuth.toFixed(5), centre.dist.toFixed(7)].join(','));
}
