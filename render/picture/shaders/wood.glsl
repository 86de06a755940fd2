// A wood's canopy: a crown in each cell of a disordered grid, lit as a dome, dark between; crowns fade where a pixel grows as
// large as they are. Dark at the foot of a wood's edge.
in vec3 facing;
in float over;
vec2 scattered(vec2 cell) {        // 0..1 twice, for a cell; detail only: nothing else has to know it
  vec2 a = fract(cell * vec2(0.3183099, 0.3678794) + vec2(0.113, 0.417));
  a += dot(a, a.yx + 19.19);
  return fract(vec2(a.x + a.y) * a.yx * vec2(1.31, 1.73) * 7.0);
}
vec4 crownAt(vec2 p) {             // from the nearest crown's middle, in cells; its height 0..1; its tone
  vec2 first = floor(p - 0.5);
  vec4 best = vec4(0.0);
  float least = 9.0;
  for (int k = 0; k < 4; k++) {
    vec2 cell = first + vec2(float(k & 1), float(k >> 1));
    vec2 at = scattered(cell);
    vec2 off = p - cell - 0.5 - 0.5 * (at - 0.5);
    float far = dot(off, off) * (1.25 - 0.5 * at.y);
    best = far < least ? vec4(off, 0.0, at.x) : best;
    least = min(least, far);
  }
  best.z = sqrt(max(1.0 - 2.1 * least, 0.0));
  return best;
}
vec3 woodColour() {
  // on the steep edge height counts as way too, or its crowns would be drawn out to stripes
  vec2 q = place.xy + vec2(0.83, -0.56) * place.z;
  float longest, px = footprint(q, longest);
  vec4 crown = crownAt(q * (1.0 / CROWN));
  float seen = shown(0.8 * CROWN, px);
  float leaves = (noise(q * 1.7 + 7.7) - 0.5) * shown(0.9, px);
  float stands = (noise(q * (1.0 / 45.0)) - 0.5) * shown(45.0, px);
  vec3 n = normalize(facing + vec3(1.7 * crown.xy * seen, 0.0));
  float dome = mix(0.62, crown.z, seen);
  float sun = max(dot(n, sunDir) + 0.35 * leaves, 0.0) * (0.30 + 0.85 * dome);
  float open = (0.55 + 0.45 * n.z) * (0.35 + 0.75 * dome) + 0.3 * leaves;
  vec3 base = WOOD * (1.0 + 0.5 * stands + 0.5 * (crown.w - 0.5) * seen + 0.3 * leaves);
  vec3 colour = base * (sunLight * sun + skyLight * open) * (0.45 + 0.55 * clamp(over * 0.14, 0.0, 1.0)) * 1.25;
  return haze(colour, length(place - eye));
}
