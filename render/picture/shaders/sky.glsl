// Sky: darker upward, brighter round the sun, high thin cloud. Colours by eye, no source.
// VTK declares: uniform vec3 zenithColour; 
// VTK declares: uniform vec3 sunGlow; 
void skyColour(out vec4 result) {
  vec3 look = normalize(place - eye);
  float up = max(look.z, 0.0);
  vec3 colour = mix(rim(look), zenithColour, 1.0 - exp2(-up * 4.2));
  colour *= 1.0 - 0.22 * up;
  float s = max(dot(look, sunDir), 0.0), s2 = s * s, s4 = s2 * s2, s8 = s4 * s4, s16 = s8 * s8;
  colour += sunGlow * (0.10 * s8 + 0.25 * s16 * s16 * s16) + vec3(1.0) * smoothstep(0.99985, 0.99993, s);
  vec2 q = look.xy / (up + 0.13);
  vec2 w = vec2(q.x * 0.8 + q.y * 0.6, q.y * 0.8 - q.x * 0.6) * vec2(0.45, 1.3);
  float n = 0.55 * noise(w * 1.3 + 3.7) + 0.28 * noise(w * 3.7 + q) + 0.17 * noise(w * 9.1);
  float veil = smoothstep(0.52, 0.86, n) * smoothstep(0.03, 0.22, up);
  colour = mix(colour, rimColour * 0.35 + 0.62 * (sunLight * 0.75 + skyLight * 0.6), CIRRUS * veil);
  result = vec4(colour, 1.0);
}
