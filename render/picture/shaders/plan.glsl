// The plan of the land; the same arithmetic as terrain/pattern.py, which says why it is exact.
float shuffle(float key) { return fract((512.0 * 38.0 * key + 197.0) * key); }
float valueNoise(vec2 p, float salt) {
  vec2 i = floor(p), f = p - i;
  f = f * f * (3.0 - 2.0 * f);
  float c = fract((17.0 * i.x + 29.0 * i.y) * (1.0 / 512.0) + salt);
  return mix(mix(shuffle(c), shuffle(c + 17.0 / 512.0), f.x), mix(shuffle(c + 29.0 / 512.0), shuffle(c + 46.0 / 512.0), f.x), f.y);
}
float wave(float x) { float t = abs(fract(x) - 0.5); return t * t * (24.0 - 32.0 * t) - 1.0; }
vec2 grain(vec2 p) {
  vec2 q = vec2(GRAIN_C * p.x + GRAIN_S * p.y, -GRAIN_S * p.x + GRAIN_C * p.y);
  return q + BEND * vec2(wave(q.y * 0.00097 + 0.2), wave(q.x * 0.00084 + 0.7));
}
void cutInTwo(float x, inout float low, inout float high, inout float key) {
  float cut = low + (0.36 + 0.28 * key) * (high - low);
  bool far = x > cut;
  low = far ? cut : low;
  high = far ? high : cut;
  key = shuffle(key + (far ? 101.0 / 512.0 : 13.0 / 512.0));
}
// key of the field, distance to its edge, whether its block is enclosed, distance across and along the field
void fieldAt(vec2 q, out float key, out float edge, out bool enclosed, out vec2 within) {
  vec2 g = q * (1.0 / BLOCK);
  float row = floor(g.y);
  float shift = shuffle(row * (1.0 / 512.0) + SALT);
  float column = floor(g.x + shift);
  vec2 at = (g - vec2(column - shift, row)) * BLOCK;
  key = shuffle(column * (1.0 / 512.0) + shift);
  enclosed = key < ENCLOSED;
  at = fract(key * 4.0) >= 0.5 ? at.yx : at;
  float l = 0.0, r = BLOCK, b = 0.0, t = BLOCK;
  cutInTwo(at.x, l, r, key);
  cutInTwo(at.y, b, t, key);
  cutInTwo(at.x, l, r, key);
  within = at - vec2(l, b);
  edge = min(min(within.x, r - at.x), min(within.y, t - at.y));
  float outer = min(min(at.x, BLOCK - at.x), min(at.y, BLOCK - at.y));
  edge = enclosed ? edge : outer;
}
float roadAt(vec2 q) {          // distance to the middle of the nearest road
  float near = floor(q.y * (1.0 / BLOCK) + 0.5);
  float road = shuffle((near + 31.0) * (1.0 / 512.0) + SALT) < ROAD_ROWS ? abs(q.y - near * BLOCK) : 1e9;
#if ROADS_ACROSS
  float turn = (q.x + 70.0 * wave(q.y * 0.00068)) * (1.0 / ROAD_EVERY) + 0.5;
  road = min(road, abs(fract(turn) - 0.5) * ROAD_EVERY);
#endif
  return road;
}
