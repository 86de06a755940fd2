// Light on an aircraft, worked out at each corner of its dense mesh: sun with a highlight, sky from above, ground from
// below, and a share from all round. Directions and the eye are in the axes of the part.
in vec3 normalPart;
// Declared by VTK from the uniforms that are set: sunPart (toward the sun), upPart (away from the ground), eyePart (where
// it is seen from); sunLight, skyLight, groundLight, aroundLight; shine (strength of the highlight).

vec3 litPaint(vec3 paint, vec3 at) {
  vec3 n = normalize(normalPart);
  float sun = max(dot(n, sunPart), 0.0), up = dot(n, upPart);
  vec3 light = aroundLight + sunLight * sun + skyLight * max(up, 0.0) + groundLight * max(-up, 0.0);
  vec3 between = normalize(sunPart + normalize(eyePart - at));
  float spot = sun > 0.0 ? pow(max(dot(n, between), 0.0), 32.0) * shine : 0.0;
  return min(paint * light + sunLight * spot, vec3(1.0));
}
