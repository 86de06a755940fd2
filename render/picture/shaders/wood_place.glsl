// Vertex side of a wood's canopy: it rises out of the ground as the eye comes near, so that none pops up.
in vec3 upward;
in float above;
out vec3 facing;
out float over;
void setWood(inout vec3 place) {
  float up = 1.0 - smoothstep(RISES_TO, RISES_FROM, length(place - eye));
  place.z -= (above + SUNK) * (1.0 - up);
  facing = normalize(mix(vec3(0.0, 0.0, 1.0), upward, up));
  over = mix(20.0, above, up);
  setRim(place);
  gl_Position = MCDCMatrix * vec4(place, 1.0);
}
