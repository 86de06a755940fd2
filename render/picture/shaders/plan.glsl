// The plan of the land; the same arithmetic as terrain/pattern.py, which says why it is exact.
float wrap(float x) { return x - floor((x + 0.5) * (1.0 / 289.0)) * 289.0; }
float permute(float x) { float y = (34.0 * x + 10.0) * x; return y - floor((y + 0.5) * (1.0 / 289.0)) * 289.0; }
float hash2(float i, float j, float salt) { return permute(permute(wrap(i + salt)) + wrap(j)); }
float valueNoise(vec2 p, float salt) {
  vec2 i = floor(p), f = p - i;
  f = f * f * (3.0 - 2.0 * f);
  float a = permute(wrap(i.x + salt)), b = permute(wrap(i.x + 1.0 + salt)), c = wrap(i.y), d = wrap(i.y + 1.0);
  return mix(mix(permute(a + c), permute(b + c), f.x), mix(permute(a + d), permute(b + d), f.x), f.y) / 289.0;
}
vec2 grain(vec2 p) {
  vec2 q = vec2(GRAIN_C * p.x + GRAIN_S * p.y, -GRAIN_S * p.x + GRAIN_C * p.y);
  return q + BEND * sin(q.yx * vec2(0.0061, 0.0053) + vec2(1.0, 2.0));
}
// key 0..288 of the field, distance to its edge, whether its block is enclosed, place within the field
void fieldAt(vec2 q, out float key, out float edge, out float enclosed, out vec2 within) {
  float row = floor(q.y / BLOCK.y);
  float shift = permute(wrap(row + SALT)) / 289.0;
  float column = floor(q.x / BLOCK.x + shift);
  vec2 at = vec2(q.x - (column - shift) * BLOCK.x, q.y - row * BLOCK.y);
  key = hash2(column, row, SALT);
  enclosed = key < ENCLOSED * 289.0 ? 1.0 : 0.0;
  vec2 low = vec2(0.0), high = BLOCK;
  for (int k = 0; k < 3; k++) {
    key = permute(key + 7.0);
    float part = 0.36 + 0.28 / 289.0 * key;
    vec2 cut = low + part * (high - low);
    bool along = (high.x - low.x) > (high.y - low.y);
    bool far = along ? at.x > cut.x : at.y > cut.y;
    if (along) { low.x = far ? cut.x : low.x; high.x = far ? high.x : cut.x; }
    else { low.y = far ? cut.y : low.y; high.y = far ? high.y : cut.y; }
    key = permute(key + (far ? 101.0 : 13.0));
  }
  within = at - low;
  vec2 inner = min(at - low, high - at), outer = min(at, BLOCK - at);
  edge = enclosed > 0.5 ? min(inner.x, inner.y) : min(outer.x, outer.y);
}
float roadAt(vec2 q) {          // distance to the middle of the nearest road
  float near = floor(q.y / BLOCK.y + 0.5);
  float road = permute(wrap(near + SALT + 31.0)) < ROAD_ROWS * 289.0 ? abs(q.y - near * BLOCK.y) : 1e9;
#if ROADS_ACROSS
  float turn = (q.x + 70.0 * sin(q.y * 0.0043)) / ROAD_EVERY + 0.5;
  road = min(road, abs(fract(turn) - 0.5) * ROAD_EVERY);
#endif
  return road;
}
