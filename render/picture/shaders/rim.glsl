// Vertex side: the colour that haze takes in the direction of this point, and how much of it is left before the edge of the world.
// VTK declares: uniform vec3 eye, sunDir, rimColour, rimGlow;
out vec3 rimAt;
out float fade;
void setRim(vec3 place) {
  vec3 ray = place - eye;
  float s = max(dot(ray.xy, sunDir.xy) * inversesqrt((dot(ray.xy, ray.xy) + 1e-3) * (dot(sunDir.xy, sunDir.xy) + 1e-6)), 0.0);
  s *= s;
  rimAt = rimColour + rimGlow * s * s;
  fade = 1.0 - smoothstep(36000.0, 58000.0, length(ray));
}
