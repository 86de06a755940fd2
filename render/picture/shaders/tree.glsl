// A crown: lumpy outline with soft edge, lit as an ellipsoid, darker below and inside.
in vec2 disc;
in vec3 sunSeen;
in vec4 leaf;
vec4 treeColour() {
  float wide = fwidth(disc.x) + fwidth(disc.y);
  float fine = clamp(1.5 - 3.0 * wide, 0.0, 1.0);
  float lump = (noise(disc * 2.3 + leaf.y * 61.0) - 0.5) * fine;
#if LEAVES
  float leaves = (noise(disc * 6.1 + leaf.y * 37.0) - 0.5) * clamp(1.5 - 6.0 * wide, 0.0, 1.0);
  leaves += (0.7 * noise(disc * 15.0 + leaf.y * 19.0) - 0.35) * clamp(1.5 - 15.0 * wide, 0.0, 1.0);
#else
  const float leaves = 0.0;
#endif
  vec2 at = vec2(disc.x / mix(1.0, 0.56 * (1.02 - disc.y), leaf.z), disc.y);
  float r = mix(length(at), max(abs(at.x), abs(at.y)), leaf.z * 0.8) + 0.42 * lump + 0.22 * leaves;
  float cover = clamp((1.0 - r) / max(wide, 0.05) + 0.4, 0.0, 1.0);
  vec3 normal = vec3(disc * 0.92, sqrt(max(1.0 - 0.8 * dot(disc, disc), 0.05)));
  float sun = clamp(0.25 + 0.85 * dot(normal, sunSeen) + 1.0 * lump + 0.8 * leaves, 0.05, 1.2);
  float open = 0.62 + 0.38 * clamp(disc.y * 0.6 + 0.5, 0.0, 1.0) + 0.5 * lump + 0.5 * leaves;
  vec3 base = mix(mix(LEAF_A, LEAF_B, leaf.x), NEEDLE * (0.8 + 0.4 * leaf.x), step(0.001, leaf.z));
  vec3 colour = base * (sunLight * sun + skyLight * open * 0.9);
  return vec4(mix(rimAt, colour, leaf.w), cover);
}
