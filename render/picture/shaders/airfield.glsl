// Runway, taxiway, apron, mown grass. a: along the runway from its middle, b: to the left of its heading.
// Sizes of the markings. Aiming point: EASA CS ADR-DSN.L.540 table L-1. Number of threshold stripes: FAA AIM table
// 2-3-2 (30 m: 8, 45 m: 12). Touchdown zone pairs from 150 m (500 ft), 22.5 m long, none within 50 m of the aiming point.
// Threshold stripes 30 m from 6 m on, figures 9 m high 12 m behind them, centre line 30 m on 20 m off: ICAO Annex 14
// volume I chapter 5, from memory.
float boxes(vec2 d, vec2 w) { vec2 c = clamp(0.5 - d / max(w, vec2(0.02)), 0.0, 1.0); return c.x * c.y; }
float slot(float x, float lo, float hi, float w) {  // cover of lo..hi by a pixel w wide at x
  w = max(w, 0.02);
  return clamp((min(hi, x + 0.5 * w) - max(lo, x - 0.5 * w)) / w, 0.0, 1.0);
}
float stripes(float x, float period, float part, float w) {  // cover of a row of bars, box filtered exactly
  w = max(w / period, 1e-3);
  float l = x / period - 0.5 * w, h = l + w;
  return (floor(h) * part + min(fract(h), part) - floor(l) * part - min(fract(l), part)) / w;
}
float numeral(int mask, vec2 at, vec2 w) {          // 3 x 5 cells of 1 x 1.8 m; bit 0 top left
  vec2 c = floor(vec2(at.x, at.y / 1.8));
  float inside = step(0.0, c.x) * step(c.x, 2.0) * step(0.0, c.y) * step(c.y, 4.0);
  int bit = int(clamp(4.0 - c.y, 0.0, 4.0)) * 3 + int(clamp(c.x, 0.0, 2.0));
  float on = float((mask >> bit) & 1) * inside;
  float blurred = 0.62 * slot(at.x, 0.0, 3.0, w.x) * slot(at.y, 0.0, 9.0, w.y);
  return mix(on, blurred, smoothstep(0.5, 1.4, max(w.x, w.y)));
}
vec3 mown(vec2 s, float px, float n1, float n7) {
  vec2 w = fwidth(s);
  float half_l = 0.5 * RUNWAY_L, half_w = 0.5 * RUNWAY_W;
  // mown grass with swaths 12 m wide along the runway, rough beyond, a track round the bounds
  float rough = clamp((abs(s.y) - 60.0) * 0.1, 0.0, 1.0);
  float swath = stripes(s.y, 24.0, 0.5, w.y) - 0.5;
  float n45 = (noise(s * vec2(0.013, 0.019) + 4.4) - 0.5);
  vec3 colour = mix(MOWN_A, MOWN_B, 0.5 + swath * (1.0 - 0.8 * rough) + 0.5 * rough * (n7 + n45)) * (1.0 + 0.20 * n7 + 0.50 * n1 + 0.20 * n45);
  colour *= mix(vec3(1.0), vec3(1.02, 0.97, 0.84), rough * (0.5 + n45));
  vec2 bounds = BOUNDS - abs(s - vec2(0.0, BOUNDS_MID));
  float rim_m = min(bounds.x, bounds.y);
  colour = mix(colour, vec3(0.47, 0.45, 0.40), band(abs(rim_m - 14.0), 2.2, max(w.x, w.y)) * 0.9);
  colour = mix(colour, colour * 0.55, band(abs(rim_m - 1.5), 1.2, max(w.x, w.y)));
  // taxiway 15 m wide at 150 m, three links, apron
  float tar = boxes(abs(s - vec2(0.0, 150.0)) - vec2(half_l, 7.5), w);
  float x = min(abs(abs(s.x) - half_l + 7.5), abs(s.x + 300.0));
  tar = max(tar, boxes(vec2(x - 7.5, abs(s.y - 75.0) - 75.0), w));
  colour = mix(colour, SURFACE * (1.06 + 0.10 * n1), tar);
  float yellow = max(band(abs(s.y - 150.0), 0.075, w.y) * step(abs(s.x), half_l - 7.0), band(x, 0.075, w.x) * step(abs(s.y - 75.0), 75.0));
  colour = mix(colour, vec3(0.80, 0.66, 0.18), yellow);
  float apron = boxes(abs(s - vec2(40.0, 205.0)) - vec2(230.0, 48.0), w);
  float joints = max(band(abs(fract(s.x / 7.5) - 0.5) * 7.5, 0.04, w.x), band(abs(fract(s.y / 7.5) - 0.5) * 7.5, 0.04, w.y));
  float slab = noise(floor(s / 7.5) * 3.7);
  colour = mix(colour, APRON * (1.0 + 0.07 * (slab - 0.5) * shown(7.5, px) - 0.25 * joints), apron);
  return colour;
}
vec3 runway(vec2 s, float px, float n1, float n7) {    // the strip of the runway itself and a little grass beside it
  vec2 w = fwidth(s);
  float half_l = 0.5 * RUNWAY_L, half_w = 0.5 * RUNWAY_W;
  vec3 colour = mix(MOWN_A, MOWN_B, 0.5) * (1.0 + 0.20 * n7 + 0.50 * n1);
  float x = min(abs(abs(s.x) - half_l + 7.5), abs(s.x + 300.0));
  colour = mix(colour, SURFACE * (1.06 + 0.10 * n1), slot(x, -7.5, 7.5, w.x) * step(0.0, s.y));
  // runway: 0.9 m side stripes, centre line 30 m on 20 m off
  float run = boxes(abs(s) - vec2(half_l, half_w), w);
  float rubber = exp2(-abs(abs(s.x) - half_l + 420.0) / 160.0) * exp2(-s.y * s.y / 40.0);
  vec3 tarmac = SURFACE * (1.0 + 0.14 * n1 + 0.10 * n7) * (1.0 - 0.35 * rubber);
  tarmac *= 1.0 - 0.10 * band(abs(abs(s.y) - 7.5), 0.05, w.y);
  float end = half_l - abs(s.x);                                  // distance in from the nearer threshold
  float y = s.x > 0.0 ? -s.y : s.y;                               // across, seen by one who lands on that end
  float we = w.x, wy = w.y;
  float mark = slot(abs(s.y), half_w - 1.2, half_w - 0.3, wy);
  mark = max(mark, band(abs(s.y), 0.23, wy) * stripes(s.x, 50.0, 0.6, w.x) * step(78.0, end));
  float bars = stripes(abs(s.y) - 1.8, 3.6, 0.5, wy) * step(1.8, abs(s.y)) * step(abs(s.y), 1.8 + 3.6 * BARS);
  mark = max(mark, slot(end, 6.0, 36.0, we) * bars);
  bool east = s.x > 0.0;
  vec2 left = vec2(-y + 4.0, end - 48.0), right = vec2(-y - 1.0, end - 48.0);
  float figures = numeral(east ? FIGURE_C : FIGURE_A, left, vec2(wy, we)) + numeral(east ? FIGURE_D : FIGURE_B, right, vec2(wy, we));
  mark = max(mark, figures);
  mark = max(mark, slot(end, AIM_AT, AIM_AT + 45.0, we) * slot(abs(s.y), 9.0, 9.0 + AIM_W, wy));
  float zone = slot(end, 150.0, 172.5, we) + slot(end, 300.0, 322.5, we) * AIM_FAR + slot(end, 600.0, 622.5, we) * AIM_FAR;
  mark = max(mark, zone * slot(abs(s.y), 9.0, 12.0, wy));
  tarmac = mix(tarmac, vec3(0.86, 0.86, 0.83) * (1.0 + 0.12 * n1), mark * 0.92);
  colour = mix(colour, tarmac, run);
  return colour;
}
