"""How surfaces are lit in the 3D view, and whether this computer can draw it at all."""

from functools import lru_cache

from PySide6.QtGui import QGuiApplication, QOffscreenSurface, QOpenGLContext
from pyqtgraph.opengl.shaders import FragmentShader, ShaderProgram, VertexShader

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
precision mediump float;
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
    vec3 shade = v_color.rgb * (0.66 + 0.30 * key + 0.10 * fill - 0.22 * edge) + 0.14 * gloss;
    gl_FragColor = vec4(shade, min(1.0, v_color.a + 0.40 * edge));
}
"""
"""Key light from the upper left, fill from the right, a small gloss; edges turned away are darker and denser, as a draughtsman
would draw them. Both sides of a surface are lit."""


@lru_cache(maxsize=1)
def shader() -> ShaderProgram:
    """The one program with which all surfaces are lit."""
    return ShaderProgram("trundle", [VertexShader(VERTEX), FragmentShader(FRAGMENT)])


def gl_available() -> bool:
    """Whether OpenGL can be used: never without a screen, else when a context can be made current."""
    if QGuiApplication.platformName() in ("offscreen", "minimal"):
        return False
    surface = QOffscreenSurface()
    surface.create()
    context = QOpenGLContext()
    if not (surface.isValid() and context.create() and context.makeCurrent(surface)):
        return False
    version = context.format().version()
    context.doneCurrent()
    return bool(version >= (2, 0))


def software_drawn() -> bool:
    """Whether the processor draws in place of a graphics card; ask with a context current."""
    context = QOpenGLContext.currentContext()
    if context is None:
        return False
    name = context.functions().glGetString(0x1F01)
    return "llvmpipe" in str(name) or "softpipe" in str(name)
