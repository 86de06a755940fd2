// Sea and shore. seaward: the same arithmetic as terrain/pattern.py.
float seaward(vec2 p) {         // metres out to sea, negative on land
  float t = p.x * SHORE_C - p.y * SHORE_S;
  return p.y * SHORE_C + p.x * SHORE_S - SHORE_OUT - 130.0 * wave(t * 0.00021 + 0.1) - 55.0 * wave(t * 0.00075 + 0.6) - 14.0 * wave(t * 0.0027);
}
// out: seaward distance. Ripples of 1.5, 6 and 40 m tilt the surface, reflect sky and sun; each fades with its pixel.
vec3 seaColour(vec2 p, vec3 ray, float out_m, float px) {
  float d = length(ray);
  vec3 look = ray / d;
  vec2 w = vec2(0.8 * p.x + 0.6 * p.y, 0.8 * p.y - 0.6 * p.x);
  float n40 = (noise(w * vec2(1.0 / 60.0, 1.0 / 24.0)) - 0.5) * shown(40.0, px);
  float n6 = (noise(w * vec2(1.0 / 9.0, 1.0 / 4.5) + 7.7) - 0.5) * shown(7.0, px);
  float n1 = (noise(w * vec2(1.0 / 2.2, 1.0 / 1.1) + 3.3) - 0.5) * shown(1.5, px);
  float n500 = noise(w * vec2(1.0 / 900.0, 1.0 / 380.0) + 1.9) - 0.5;   // catspaws
  vec2 slope = vec2(0.30 * n6 + 0.26 * n1, 0.22 * n40 - 0.26 * n6 + 0.22 * n1);
  vec3 normal = normalize(vec3(slope, 1.0));
  float facing = clamp(-dot(look, normal), 0.0, 1.0), away = 1.0 - facing;
  float mirror = 0.02 + 0.98 * away * away * away * away * away;       // Schlick 1994, water
  mirror *= 1.0 - 0.5 * n500;
  mirror = mix(mirror, 0.55 * mirror, clamp(px * 0.3, 0.0, 1.0));      // far waves show their near faces
  vec3 back = reflect(look, normal);
  float up = clamp(back.z, 0.0, 1.0);
  vec3 sky = mix(rimAt, zenithColour, 1.0 - exp2(-3.5 * up));
  float spread = max(dot(back, sunDir), 0.0);
  spread *= spread; spread *= spread; spread *= spread; spread *= spread; spread *= spread;
  float depth = clamp(out_m * (1.0 / 260.0) + 0.3 * n40, 0.0, 1.0);
  vec3 body = mix(SHALLOW, DEEP, depth * (2.0 - depth)) * flatLight * (1.0 + 0.35 * n6 + 0.30 * n1 + 0.25 * n40 + 0.22 * n500);
  vec3 colour = mix(body, sky, mirror) + sunLight * 0.35 * spread;
  float caps = clamp((n6 + 0.9 * n1 + 0.7 * n40 - 0.52) * 5.0, 0.0, 1.0);
  return mix(colour, vec3(0.86) * flatLight, 0.55 * caps);
}
float foamAt(float out_m, vec2 p, float px, float n7) {
  float w = fwidth(out_m);
  float swell = band(abs(out_m - 3.0 - 3.0 * n7), 2.2, w) + 0.7 * band(abs(out_m - 19.0 - 9.0 * n7), 1.1, w) + 0.4 * band(abs(out_m - 37.0 - 12.0 * n7), 0.8, w);
  return clamp(swell, 0.0, 1.0);
}
