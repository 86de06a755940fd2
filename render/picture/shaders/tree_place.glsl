// Vertex side of a tree: four corners turn to the eye round the crown's middle; the crown is an ellipsoid of revolution.
in vec2 corner;                 // -1 or 1
in vec4 crown;                  // half height, half width, height of its middle above the ground, 1 for a conifer
in vec2 tint;                   // tone, seed
out vec2 disc;                  // -1.. 1 across and up the crown as seen
out vec3 sunSeen;               // the sun in the axes right, up, toward the eye
out vec4 leaf;                  // tone, seed, 1 for a conifer seen from the side, haze left
const float MARGIN = 1.12;
vec4 setTree(vec3 foot) {
  vec3 middle = foot + vec3(0.0, 0.0, crown.z), ray = middle - eye;
  float d = length(ray);
  vec3 look = ray / d;
  vec3 right = normalize(vec3(look.y, -look.x, 0.0) + vec3(1e-5, 0.0, 0.0)), up = cross(right, look);
  float tall = sqrt(crown.x * crown.x * (1.0 - look.z * look.z) + crown.y * crown.y * look.z * look.z);
  disc = MARGIN * corner;
  sunSeen = vec3(dot(sunDir, right), dot(sunDir, up), -dot(sunDir, look));
  setRim(middle);
  leaf = vec4(tint, crown.w * (1.0 - look.z * look.z), exp(-extinction * d) * fade);
  return vec4(middle + MARGIN * (corner.x * crown.y * right + corner.y * tall * up), 1.0);
}
