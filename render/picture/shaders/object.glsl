// Buildings, vehicles, hedges. paint: lit colour; wall: metres along and up the face, its length, what it is.
in vec3 paint;
in vec4 wall;
vec3 objectColour() {
  float d = length(place - eye), kind = floor(wall.w + 0.5);
  vec2 w = max(fwidth(wall.xy), vec2(0.02));
  vec2 cell = vec2(abs(fract(wall.x * (1.0 / 3.2) + 0.5) - 0.5) * 3.2, abs(fract((wall.y - 1.6) * (1.0 / 2.6) + 0.5) - 0.5) * 2.6);
  vec2 pane = clamp((vec2(0.55, 0.65) - cell) / w + 0.5, 0.0, 1.0) * min(vec2(1.0), vec2(1.1, 1.3) / w);
  float panes = pane.x * pane.y * step(0.8, wall.x) * step(wall.x, wall.z - 0.8);
  float door = clamp((0.38 * wall.z - abs(wall.x - 0.5 * wall.z)) / w.x + 0.5, 0.0, 1.0) * clamp((6.6 - wall.y) / w.y + 0.5, 0.0, 1.0);
  float leafs = 0.75 + 0.25 * clamp((abs(fract(wall.x * 0.22) - 0.5) - 0.03) * 4.5 / w.x + 0.5, 0.0, 1.0);
  float glass = clamp((wall.y - 10.8) / w.y + 0.5, 0.0, 1.0) * clamp((13.9 - wall.y) / w.y + 0.5, 0.0, 1.0);
  float screen = clamp((wall.y - 0.85) / w.y + 0.5, 0.0, 1.0) * clamp((1.35 - wall.y) / w.y + 0.5, 0.0, 1.0);
  vec3 dark = vec3(0.16, 0.19, 0.22);
  vec3 colour = paint;
  colour = kind == 1.0 ? mix(colour, dark, 0.85 * panes) : colour;
  colour = kind == 2.0 ? mix(colour, colour * 0.72 * leafs, door) : colour;
  colour = kind == 3.0 ? mix(colour, dark, 0.9 * glass) : colour;
  colour = kind == 4.0 ? mix(colour, dark, 0.85 * screen) : colour;
  float leaves = noise(wall.xy * 2.1 + place.xy * 0.4) - 0.5 + 0.7 * (noise(wall.xy * 6.3) - 0.5) * clamp(1.4 - 6.0 * w.y, 0.0, 1.0);
  colour *= kind == 5.0 ? 1.0 + 0.9 * leaves * clamp(1.4 - 1.5 * w.y, 0.0, 1.0) : 1.0;
  return haze(colour, d);
}
