// Vertex side of a tree's shadow, laid on the ground by the program.
in vec2 corner;
out vec2 disc;
out float left;                 // haze left
void setShadow(vec3 place) { disc = corner; setRim(place); left = exp(-extinction * length(place - eye)) * fade; }
