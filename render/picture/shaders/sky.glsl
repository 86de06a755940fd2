// Sky: the clear sky's colour comes from the corners of the dome (render/picture/sky.py); here the sun and high thin cloud.
in vec3 clearSky;
in vec4 veilAt;                 // east, north, up of the look (up lifted, so that the veil does not crowd the horizon); its thickness
in vec3 fromSun;                // the look less the sun's direction
float sunDisc() { return clamp((0.00020 - dot(fromSun, fromSun)) * 12000.0, 0.0, 1.0); }
vec3 skyColour() {
  vec2 q = veilAt.xy / veilAt.z;
  float n = veilAt.w + 0.42 * noise(q * vec2(2.1, 4.6) + q.yx * 0.7);
  float veil = clamp(n * 2.4, 0.0, 1.0);
  vec3 colour = mix(clearSky, VEIL_COLOUR, VEIL * veil);
  return colour + sunDisc();
}
