// The look of the open country. Every detail fades where a pixel grows larger than it, so the ground needs no antialiasing.
vec3 country(vec2 q, float px, float longest, float n1, float n7, float n45) {
  float key, edge; bool enclosed; vec2 within;
  fieldAt(q, key, edge, enclosed, within);
  float road = roadAt(q);
  float n600 = valueNoise(q * (1.0 / 600.0), SALT);
  float kind = shuffle(key + 57.0 / 512.0), tone = key;

  float patches = n600 + 0.5 * n45;
  vec3 wild = mix(WILD_A, WILD_B, clamp(0.5 + 4.0 * (patches - WILD_LEVEL), 0.0, 1.0));
  wild = mix(wild, WILD_C, clamp((n45 + 0.5 * n7 - 0.12) * 8.0, 0.0, 1.0) * 0.9);
  vec3 field = fieldColour(kind) * (0.86 + 0.28 * tone) * vec3(1.0 + 0.10 * (tone - 0.5), 1.0, 1.0 - 0.2 * (tone - 0.5));
  // drill rows 1.5 m and tramlines every 24 m, along the field's own direction; swaths of hay 8 m
  float across = fract(tone * 7.0) > 0.35 ? within.x : within.y, wa = fwidth(across);
  float rows = (abs(fract(across * (1.0 / 1.5)) - 0.5) * 4.0 - 1.0) * clamp(1.3 - 1.6 * wa, 0.0, 1.0);
  float tram = band(abs(abs(fract(across * (1.0 / 24.0)) - 0.5) * 24.0 - 0.95), 0.28, wa) * clamp(1.6 - 0.18 * wa, 0.0, 1.0);
  float swath = (abs(fract(across * (1.0 / 16.0)) - 0.5) > 0.25 ? 0.05 : -0.05) * clamp(1.4 - 0.2 * wa, 0.0, 1.0);
  field *= 1.0 + (kind > CROP_FROM ? 0.06 * rows - 0.30 * tram : (tone > 0.4 ? swath : 0.0));
  vec3 colour = enclosed ? field : wild;
  colour *= 1.0 + (enclosed ? 0.16 : 0.30) * (1.5 * n1 + 1.2 * n7 + 0.9 * n45) + 0.20 * (n600 - 0.5);

  float wooded = clamp(enclosed ? (kind < WOOD_PART ? 0.5 * (edge - 2.0) : 0.0) : (n600 - WILD_WOOD) * 90.0, 0.0, 1.0);
  colour = mix(colour, WOOD * (1.0 + 0.8 * n7 + 0.5 * n45 + 0.5 * n1), wooded);
  // far off many fields share a pixel: toward their mean, so that the rim of the land does not glitter
  colour = mix(colour, COUNTRY_MEAN, clamp(longest * (0.35 / FIELD) - 0.25, 0.0, 0.85));
  float wh = fwidth(edge);
  float hedge = band(edge + 1.2 * n7, 0.5 * HEDGE, wh > 100.0 ? px : wh);
  colour = mix(colour, HEDGE_COLOUR * (1.0 + 0.6 * n7), enclosed ? hedge : 0.0);
  float wr = fwidth(road); wr = wr > 100.0 ? px : wr;
  colour = mix(colour, VERGE * (1.0 + 0.4 * n1), band(road, 0.5 * ROAD + 3.5, wr));
  colour = mix(colour, ROAD_COLOUR * (1.0 + 0.12 * n1), band(road, 0.5 * ROAD, wr));
#if ROAD_LINE
  colour = mix(colour, vec3(0.82), band(road, 0.06, wr));
#endif
  return colour;
}
