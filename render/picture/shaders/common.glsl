// Shared by every piece of the land: haze, noise, footprints. Display axes: x east, y north, z up; metres.
// VTK declares: uniform vec3 eye (seen from), sunDir (toward the sun), sunLight (colour of direct light),
// skyLight (of the whole sky), flatLight (of both on level ground); uniform float extinction (per metre)
in vec3 place;
in vec3 rimAt;
in float fade;

vec3 haze(vec3 colour, float d) {       // exp(-x) as the 32nd power of its series to x^2: within 1 % down to 2 % contrast
  float y = min(extinction * d * (1.0 / 32.0), 1.0);
  float left = 1.0 - y + 0.5 * y * y;
  left *= left; left *= left; left *= left; left *= left; left *= left;
  return mix(rimAt, colour, left * fade);
}
float noise(vec2 p) {           // detail only: nothing else has to know it
  vec2 i = floor(p), f = p - i;
  f = f * f * (3.0 - 2.0 * f);
  vec2 a = 50.0 * fract(i * 0.3183099 + 0.071), b = 50.0 * fract((i + 1.0) * 0.3183099 + 0.071);
  vec2 low = fract(vec2(a.x, b.x) * a.y * (vec2(a.x, b.x) + a.y));
  vec2 high = fract(vec2(a.x, b.x) * b.y * (vec2(a.x, b.x) + b.y));
  vec2 r = mix(low, high, f.y);
  return mix(r.x, r.y, f.x);
}
float shown(float size, float px) { return clamp((0.85 * size - px) / (0.6 * size), 0.0, 1.0); }
float footprint(vec2 p, out float longest) {       // a pixel's size on the ground, m: between its long and short side; its long side
  vec2 dx = dFdx(p), dy = dFdy(p);
  longest = sqrt(max(dot(dx, dx), dot(dy, dy)));
  return sqrt(longest * sqrt(abs(dx.x * dy.y - dx.y * dy.x) + 1e-8));
}
float band(float d, float half_width, float w) {   // cover of a line of that half width by a pixel w wide
  float soft = max(w, 0.02);
  return clamp((half_width - d) / soft + 0.5, 0.0, 1.0) * min(1.0, 2.0 * half_width / soft);
}
