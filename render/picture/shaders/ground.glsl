// The look of the open country. Every detail fades where a pixel grows larger than it, so the ground needs no antialiasing.
float shown(float size, float px) { return 1.0 - smoothstep(0.28 * size, 0.8 * size, px); }
float band(float d, float half_width, float w) {   // cover of a line of that half width in a pixel w wide
  return clamp((half_width - d) / max(w, 0.02) + 0.5, 0.0, 1.0) * min(1.0, 2.0 * half_width / max(w, 0.02) + 0.0);
}
float footprint(vec2 p) {                          // pixel size on the ground, m, between its long and its short side
  vec2 dx = dFdx(p), dy = dFdy(p);
  float longest = sqrt(max(dot(dx, dx), dot(dy, dy)));
  float area = abs(dx.x * dy.y - dx.y * dy.x);
  return sqrt(longest * sqrt(max(area, 1e-8)));
}
vec3 country(vec2 p, float px, out float roughness) {
  vec2 q = grain(p);
  float key, edge, enclosed; vec2 within;
  fieldAt(q, key, edge, enclosed, within);
  float road = roadAt(q);
  float n600 = valueNoise(q / 600.0, SALT);
  float n45 = noise(q / 45.0), n7 = noise(q / 7.0 + 11.3), n1 = noise(q / 1.3 + 5.1);
  float s45 = shown(45.0, px), s7 = shown(7.0, px), s1 = shown(1.3, px);
  float kind = permute(key + 57.0) / 289.0, tone = permute(key + 91.0) / 289.0;

  vec3 wild = mix(WILD_A, WILD_B, smoothstep(0.35, 0.65, 0.6 * n600 + 0.4 * mix(0.5, n45, s45) ));
  wild = mix(wild, WILD_C, smoothstep(0.60, 0.70, mix(0.5, n45, s45) * 0.75 + mix(0.5, n7, s7) * 0.25));
  vec3 field = fieldColour(kind, tone);
  float crop = smoothstep(CROP_FROM, CROP_FROM + 0.02, kind);
  // drill rows 1.5 m and tramlines every 24 m, along the field's own direction
  float across = tone > 0.5 ? within.x : within.y, wa = fwidth(across);
  float rows = cos(across * (6.28318 / 1.5)) * (1.0 - smoothstep(0.25, 0.9, wa));
  float tram = band(abs(abs(fract(across / 24.0) - 0.5) * 24.0 - 0.95), 0.28, wa) * (1.0 - smoothstep(3.0, 9.0, wa));
  float swath = (step(0.5, fract(across / 16.0)) - 0.5) * (1.0 - smoothstep(2.5, 7.0, wa));
  field *= 1.0 + crop * (0.07 * rows - 0.26 * tram) + (1.0 - crop) * 0.05 * swath * step(0.4, tone);
  vec3 colour = mix(wild, field, enclosed);

  // the worn ground of gateways and tracks, hedges, roads
  float we = fwidth(edge);
  float wood = enclosed > 0.5 ? (kind < WOOD_PART ? smoothstep(-2.0, 2.0, edge - 3.0) : 0.0)
                              : smoothstep(WILD_WOOD, WILD_WOOD + 0.012, n600);
  roughness = mix(0.30, 0.16, enclosed);
  vec3 canopy = WOOD * (0.55 + 0.9 * mix(0.5, n7, s7));
  colour = mix(colour, canopy, wood);
  float hedge = band(edge, 0.5 * HEDGE, we) * (1.0 - (1.0 - enclosed) * step(0.5, BARE_OPEN));
  colour = mix(colour, HEDGE_COLOUR * (0.75 + 0.5 * mix(0.5, n7, s7)), hedge * HEDGE_SHOWN);
  float wr = fwidth(road); wr = wr > 200.0 ? px : wr;
  float verge = band(road, 0.5 * ROAD + 3.0, wr), lane = band(road, 0.5 * ROAD, wr);
  colour = mix(colour, VERGE, verge);
  colour = mix(colour, ROAD_COLOUR, lane);
  colour = mix(colour, vec3(0.80), band(road, 0.06, wr) * 0.8 * ROAD_LINE);
  roughness *= 1.0 - 0.8 * lane;
  colour *= 1.0 + roughness * (1.3 * s1 * (n1 - 0.5) + 1.1 * s7 * (n7 - 0.5) + 0.8 * s45 * (n45 - 0.5)) + 0.16 * (n600 - 0.5);
  return colour;
}
