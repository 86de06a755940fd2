// Sky: the clear sky's colour comes from the corners of the dome (render/picture/sky.py); here the sun and high thin cloud.
in vec3 clearSky;
in vec3 veilAt;                 // east, north, up of the look; up lifted, so that the veil does not crowd the horizon
in vec3 fromSun;                // the look less the sun's direction
vec3 skyColour() {
  vec2 q = veilAt.xy / veilAt.z;
  float n = 0.62 * noise(q * vec2(0.6, 1.7) + 3.7) + 0.38 * noise(q * vec2(2.1, 4.6) + q.yx * 0.7);
  float veil = clamp((n - VEIL_FROM) * 2.6, 0.0, 1.0) * clamp(veilAt.z * 4.0 - 0.75, 0.0, 1.0);
  vec3 colour = mix(clearSky, VEIL_COLOUR, VEIL * veil);
  float disc = clamp((0.00020 - dot(fromSun, fromSun)) * 12000.0, 0.0, 1.0);
  return colour + disc;
}
