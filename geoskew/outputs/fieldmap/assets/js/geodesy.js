"use strict";
// Directions and polarisation angles at any place, on WGS 84; degrees in, degrees and kilometres out.
// Signs: azimuth clockwise from true north; skew positive clockwise for a person who looks towards the
// satellite; every difference of polarisation angles in (-90, 90].
(function (fm) {
  const EQUATOR_M = 6378137.0; // WGS 84, NGA.STND.0036
  const FLATTENING = 1 / 298.257223563;
  const ECCENTRICITY_SQUARED = FLATTENING * (2 - FLATTENING);
  const ORBIT_M = 42164170.0;
  const RADIAN = Math.PI / 180;

  const dot = (a, b) => a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
  const cross = (a, b) => [a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0]];
  const minus = (a, b) => [a[0] - b[0], a[1] - b[1], a[2] - b[2]];
  const along = (a, b, t) => [a[0] + t * b[0], a[1] + t * b[1], a[2] + t * b[2]];
  const unit = (a) => {
    const length = Math.sqrt(dot(a, a));
    return [a[0] / length, a[1] / length, a[2] / length];
  };

  const fold = (angle) => {
    const folded = 90 - (((90 - angle) % 180) + 180) % 180;
    return folded <= -90 ? 90 : folded;
  };

  function positionOnEllipsoid(longitude, latitude, height) {
    const [lon, lat] = [longitude * RADIAN, latitude * RADIAN];
    const curvature = EQUATOR_M / Math.sqrt(1 - ECCENTRICITY_SQUARED * Math.sin(lat) ** 2);
    const aside = (curvature + height) * Math.cos(lat);
    return [
      aside * Math.cos(lon),
      aside * Math.sin(lon),
      (curvature * (1 - ECCENTRICITY_SQUARED) + height) * Math.sin(lat),
    ];
  }

  function positionInOrbit(satellite) {
    const [lon, lat] = [satellite.longitude * RADIAN, satellite.latitude * RADIAN];
    return [
      ORBIT_M * Math.cos(lat) * Math.cos(lon),
      ORBIT_M * Math.cos(lat) * Math.sin(lon),
      ORBIT_M * Math.sin(lat),
    ];
  }

  // The satellite's beam axis and its V axis with the tilt, both Earth-fixed unit vectors.
  function frameOf(satellite) {
    const at = positionInOrbit(satellite);
    const target = satellite.aim ? positionOnEllipsoid(satellite.aim[0], satellite.aim[1], 0) : [0, 0, 0];
    const axis = unit(minus(target, at));
    const north = unit(along([0, 0, 1], axis, -axis[2]));
    const right = cross(axis, north);
    const [c, s] = [Math.cos(satellite.tilt * RADIAN), Math.sin(satellite.tilt * RADIAN)];
    const vertical = along([c * north[0], c * north[1], c * north[2]], right, -s);
    return { at, axis, vertical };
  }

  // Ludwig's third definition: a vector normal to `start` carried along the great circle to `end`.
  function carried(vector, start, end) {
    const sum = [start[0] + end[0], start[1] + end[1], start[2] + end[2]];
    return along(vector, sum, -dot(vector, end) / (1 + dot(start, end)));
  }

  // Angle of a vector from the local vertical, in the plane normal to the line of sight `k` (travel).
  function fromVertical(vector, k, up) {
    const vertical = along(up, k, -dot(up, k));
    const right = cross([-k[0], -k[1], -k[2]], vertical);
    return fold(Math.atan2(dot(vector, right), dot(vector, vertical)) / RADIAN);
  }

  function sight(satellite, longitude, latitude, height) {
    const frame = frameOf(satellite);
    const place = positionOnEllipsoid(longitude, latitude, height);
    const path = minus(place, frame.at);
    const k = unit(path);
    const [lon, lat] = [longitude * RADIAN, latitude * RADIAN];
    const up = [Math.cos(lat) * Math.cos(lon), Math.cos(lat) * Math.sin(lon), Math.sin(lat)];
    const east = [-Math.sin(lon), Math.cos(lon), 0];
    const north = cross(up, east);
    const azimuth = Math.atan2(-dot(k, east), -dot(k, north)) / RADIAN;
    const arriving = carried(frame.vertical, frame.axis, k);
    return {
      k,
      up,
      arriving,
      azimuth: (azimuth + 360) % 360,
      elevation: Math.asin(Math.max(-1, Math.min(1, -dot(k, up)))) / RADIAN,
      range: Math.sqrt(dot(path, path)) / 1000,
      skew: fromVertical(arriving, k, up),
    };
  }

  // Everything about one place. Below the lowest usable elevation a satellite gives no skew there (NaN).
  fm.atPlace = function (geometry, longitude, latitude, height) {
    const before = sight(geometry.outgoing, longitude, latitude, height || 0);
    const after = sight(geometry.incoming, longitude, latitude, height || 0);
    const seesBefore = before.elevation >= geometry.lowest;
    const seesAfter = after.elevation >= geometry.lowest;
    const both = seesBefore && seesAfter;
    const seen = fromVertical(carried(after.arriving, after.k, before.k), before.k, after.up);
    const untouched = fold(before.skew - seen - geometry.port);
    return {
      azimuth_before: before.azimuth,
      azimuth_after: after.azimuth,
      elevation_before: before.elevation,
      elevation_after: after.elevation,
      range_before: before.range,
      range_after: after.range,
      skew_before: seesBefore ? before.skew : NaN,
      skew_after: seesAfter ? after.skew : NaN,
      seen_after: both ? seen : NaN,
      turn_realigned: both && geometry.linear ? fold(after.skew + geometry.port - before.skew) : NaN,
      mismatch_untouched: both && geometry.linear ? mismatch(untouched) : NaN,
    };
  };

  // Loss of the wanted carrier by cos² alone, in dB, never negative, capped at 40 dB.
  function mismatch(angle) {
    const wanted = Math.cos(angle * RADIAN) ** 2;
    return Math.max(0, Math.min(40, wanted > 0 ? -10 * Math.log10(wanted) : 40));
  }

  // Where a line of `metres` along an azimuth ends, and back: distance and azimuth between two places.
  // On the sphere of mean radius: for lines of a few tens of kilometres right to a part in two hundred.
  const MEAN_M = 6371008.8;
  fm.placeAlong = function (longitude, latitude, azimuth, metres) {
    const [lat, turn, arc] = [latitude * RADIAN, azimuth * RADIAN, metres / MEAN_M];
    const to = Math.asin(Math.sin(lat) * Math.cos(arc) + Math.cos(lat) * Math.sin(arc) * Math.cos(turn));
    const aside = Math.atan2(
      Math.sin(turn) * Math.sin(arc) * Math.cos(lat),
      Math.cos(arc) - Math.sin(lat) * Math.sin(to)
    );
    return [longitude + aside / RADIAN, to / RADIAN];
  };

  fm.between = function (longitude, latitude, toLongitude, toLatitude) {
    const [lat, to, aside] = [latitude * RADIAN, toLatitude * RADIAN, (toLongitude - longitude) * RADIAN];
    const azimuth = Math.atan2(
      Math.sin(aside) * Math.cos(to),
      Math.cos(lat) * Math.sin(to) - Math.sin(lat) * Math.cos(to) * Math.cos(aside)
    );
    const half = Math.sin((to - lat) / 2) ** 2 + Math.cos(lat) * Math.cos(to) * Math.sin(aside / 2) ** 2;
    return { azimuth: (azimuth / RADIAN + 360) % 360, metres: 2 * MEAN_M * Math.asin(Math.sqrt(half)) };
  };

  fm.fold = fold;
})(globalThis.FieldMap);
