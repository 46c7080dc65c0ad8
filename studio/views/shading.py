"""How surfaces are lit in the 3D view, and whether this computer can draw it at all."""

from functools import lru_cache

from pyqtgraph.opengl.shaders import FragmentShader, ShaderProgram, VertexShader
from PySide6.QtGui import QGuiApplication, QOffscreenSurface, QOpenGLContext

GL_RENDERER = 0x1F01
"""Name of the renderer, as OpenGL numbers it."""
LEAST_VERSION = (2, 1)
SOFTWARE = ("llvmpipe", "softpipe", "swiftshader", "software")

VERTEX = """
uniform mat4 u_mvp;
uniform mat3 u_normal;
attribute vec4 a_position;
attribute vec3 a_normal;
attribute vec4 a_color;
varying vec4 v_color;
varying vec3 v_normal;
void main() {
    v_normal = u_normal * a_normal;
    v_color = a_color;
    gl_Position = u_mvp * a_position;
}
"""
FRAGMENT = """
#ifdef GL_ES
#ifdef GL_OES_standard_derivatives
#extension GL_OES_standard_derivatives : enable
#define CHANGE(x) fwidth(x)
#else
#define CHANGE(x) 0.1
#endif
precision mediump float;
#else
#define CHANGE(x) fwidth(x)
#endif
varying vec4 v_color;
varying vec3 v_normal;
void main() {
    vec3 n = normalize(v_normal);
    if (n.z < 0.0) { n = -n; }
    float key = max(dot(n, vec3(-0.42, 0.72, 0.55)), 0.0);
    float fill = max(dot(n, vec3(0.70, 0.10, 0.70)), 0.0);
    float gloss = pow(max(dot(n, vec3(-0.24, 0.41, 0.88)), 0.0), 40.0);
    float edge = pow(1.0 - n.z, 2.0);
    vec3 shade = v_color.rgb * (0.72 + 0.28 * key + 0.10 * fill - 0.16 * edge) + 0.10 * gloss;
    float soft = v_color.a < 0.99 ? clamp(0.5 * n.z / max(CHANGE(n.z), 1e-4), 0.0, 1.0) : 1.0;
    gl_FragColor = vec4(shade, soft * min(1.0, v_color.a + 0.55 * edge));
}
"""
"""Key light from the upper left, fill from the right, a small gloss; what one looks through is denser where it turns
away, as a draughtsman would draw it, and fades over the last pixel so that its edge is smooth (a pixel inside the edge
of a tube of radius R px, n.z is sqrt(2 / R) and changes by half of that a pixel). Both sides are lit."""

LINE_VERTEX = """
uniform mat4 u_mvp;
uniform float u_view[3];
attribute vec4 a_position;
attribute vec3 a_normal;
attribute vec4 a_color;
varying vec4 v_color;
varying vec2 v_line;
void main() {
    vec2 half_size = vec2(u_view[0], u_view[1]);
    vec4 here = u_mvp * a_position;
    vec4 there = u_mvp * vec4(a_position.xyz + a_normal, 1.0);
    vec2 step = (there.xy / there.w - here.xy / here.w) * half_size;
    float size = length(step);
    vec2 ahead = size > 1e-6 ? step / size : vec2(1.0, 0.0);
    float side = 2.0 * a_color.a - 1.0;
    float reach = 0.5 * u_view[2] + 1.0;
    here.xy += side * reach * vec2(-ahead.y, ahead.x) / half_size * here.w;
    here.z -= 0.0004 * here.w;
    v_line = vec2(side * reach, 0.5 * u_view[2] + 0.5);
    v_color = a_color;
    gl_Position = here;
}
"""
LINE_FRAGMENT = """
#ifdef GL_ES
precision mediump float;
#endif
varying vec4 v_color;
varying vec2 v_line;
void main() {
    gl_FragColor = vec4(v_color.rgb, clamp(v_line.y - abs(v_line.x), 0.0, 1.0));
}
"""
"""Lines of even width on screen, smooth: the normal holds a short step along the line, the opacity the side."""


@lru_cache(maxsize=1)
def shader() -> ShaderProgram:
    """The one program with which all surfaces are lit."""
    return ShaderProgram("trundle", [VertexShader(VERTEX), FragmentShader(FRAGMENT)])


@lru_cache(maxsize=4)
def line_shader(name: str) -> ShaderProgram:
    """Program for lines of one width; `u_view`: half the width and height of the view, width of a line, px."""
    program = ShaderProgram(f"trundle {name}", [VertexShader(LINE_VERTEX), FragmentShader(LINE_FRAGMENT)])
    program["u_view"] = [1.0, 1.0, 1.0]
    return program


@lru_cache(maxsize=1)
def gl_renderer() -> str | None:
    """Name of what draws with OpenGL; None without a screen, or when no context can be made current."""
    if QGuiApplication.platformName() in ("offscreen", "minimal"):
        return None
    surface = QOffscreenSurface()
    surface.create()
    context = QOpenGLContext()
    if not (surface.isValid() and context.create() and context.makeCurrent(surface)):
        return None
    name, version = str(context.functions().glGetString(GL_RENDERER)), context.format().version()
    context.doneCurrent()
    return name if version >= LEAST_VERSION else None


def gl_available() -> bool:
    """Whether OpenGL can be used."""
    return gl_renderer() is not None


def samples() -> int:
    """Samples per pixel: four on a graphics card, none where the processor draws (three times as slow there)."""
    name = gl_renderer() or ""
    return 0 if any(word in name.lower() for word in SOFTWARE) else 4
