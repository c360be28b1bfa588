"use strict";
// Where the sun stands: J. Meeus, Astronomical Algorithms, 2nd ed., ch. 13 and 25 (low accuracy, 0.01° in
// longitude), without refraction. Good enough to point by: a sun's width is half a degree.
(function (fm) {
  const RADIAN = Math.PI / 180;

  // Azimuth clockwise from north and elevation, degrees; `when` in milliseconds since 1970 (UTC).
  fm.sunAt = function (when, longitude, latitude) {
    const days = when / 86400000 + 2440587.5 - 2451545.0;
    const t = days / 36525;
    const meanLongitude = 280.46646 + 36000.76983 * t + 0.0003032 * t * t;
    const anomaly = (357.52911 + 35999.05029 * t - 0.0001537 * t * t) * RADIAN;
    const centre =
      (1.914602 - 0.004817 * t) * Math.sin(anomaly) +
      (0.019993 - 0.000101 * t) * Math.sin(2 * anomaly) +
      0.000289 * Math.sin(3 * anomaly);
    const node = (125.04 - 1934.136 * t) * RADIAN;
    const apparent = (meanLongitude + centre - 0.00569 - 0.00478 * Math.sin(node)) * RADIAN;
    const obliquity = (23.439291 - 0.0130042 * t + 0.00256 * Math.cos(node)) * RADIAN;
    const ascension = Math.atan2(Math.cos(obliquity) * Math.sin(apparent), Math.cos(apparent));
    const declination = Math.asin(Math.sin(obliquity) * Math.sin(apparent));
    const sidereal = (280.46061837 + 360.98564736629 * days + longitude) * RADIAN;
    const hour = sidereal - ascension;
    const lat = latitude * RADIAN;
    const up = Math.sin(lat) * Math.sin(declination) + Math.cos(lat) * Math.cos(declination) * Math.cos(hour);
    const east = -Math.cos(declination) * Math.sin(hour);
    const north = Math.cos(lat) * Math.sin(declination) - Math.sin(lat) * Math.cos(declination) * Math.cos(hour);
    return {
      azimuth: (Math.atan2(east, north) / RADIAN + 360) % 360,
      elevation: Math.asin(Math.max(-1, Math.min(1, up))) / RADIAN,
    };
  };

  // Moments of the 24 hours from `start` at which the sun, above the horizon, crosses an azimuth.
  fm.sunCrossings = function (start, longitude, latitude, azimuth) {
    const off = (when) => {
      const turn = fm.sunAt(when, longitude, latitude).azimuth - azimuth;
      return ((((turn + 180) % 360) + 360) % 360) - 180;
    };
    const found = [];
    const step = 600000;
    for (let when = start; when < start + 86400000; when += step) {
      let [low, high] = [when, when + step];
      const [first, last] = [off(low), off(high)];
      if (first * last > 0 || Math.abs(first - last) > 180) continue;
      while (high - low > 1000) {
        const middle = (low + high) / 2;
        if (off(middle) * off(low) <= 0) high = middle;
        else low = middle;
      }
      if (fm.sunAt(low, longitude, latitude).elevation > 0) found.push(Math.round(low));
    }
    return found;
  };
})(globalThis.FieldMap);
