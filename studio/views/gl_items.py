"""What the 3D view is made of: lit meshes, meshes one looks through, lines of an even width on screen."""

from typing import Any

import numpy as np
from OpenGL import GL
from pyqtgraph.opengl import GLMeshItem, MeshData

from studio.stage import Group, Ribbon
from studio.views.shading import line_shader

BLEND: dict[Any, Any] = {
    GL.GL_DEPTH_TEST: True,
    GL.GL_BLEND: True,
    "glBlendFuncSeparate": (GL.GL_SRC_ALPHA, GL.GL_ONE_MINUS_SRC_ALPHA, GL.GL_ONE, GL.GL_ONE_MINUS_SRC_ALPHA),
}


class ClearMesh(GLMeshItem):
    """Surface one looks through: far sides first, then near sides, without hiding what is inside."""

    def paint(self) -> None:
        """Draw in two passes."""
        GL.glEnable(GL.GL_CULL_FACE)
        GL.glDepthMask(GL.GL_FALSE)
        for hidden in (GL.GL_FRONT, GL.GL_BACK):
            GL.glCullFace(hidden)
            super().paint()
        GL.glDepthMask(GL.GL_TRUE)
        GL.glDisable(GL.GL_CULL_FACE)


class Lines(GLMeshItem):
    """Lines of an even width on screen."""

    def __init__(self, name: str, width: float) -> None:
        super().__init__(shader=line_shader(name), smooth=True, glOptions=BLEND)
        self.line_width = width

    def fill(self, lines: Ribbon, colours: np.ndarray) -> None:
        """Take lines and the colour (k, 3) of each of their rows."""
        self.setVisible(len(lines.faces) > 0)
        if len(lines.faces) == 0:
            return
        rgba = np.concatenate([colours[lines.source, :3], lines.side[:, None]], axis=1).astype(np.float32)
        mesh = MeshData(vertexes=lines.points, faces=lines.faces, vertexColors=rgba)
        mesh._vertexNormals = lines.ahead
        self.setMeshData(meshdata=mesh)

    def paint(self) -> None:
        """Draw for the present size of the view, hiding nothing: the smooth edges must not leave gaps."""
        view = self.view()
        self.shader()["u_view"] = [
            0.5 * view.deviceWidth(),
            0.5 * view.deviceHeight(),
            self.line_width * view.devicePixelRatioF(),
        ]
        GL.glDepthMask(GL.GL_FALSE)
        super().paint()
        GL.glDepthMask(GL.GL_TRUE)


def fill(item: GLMeshItem, shown: Group, colours: np.ndarray) -> None:
    """Give an item a mesh with the normals it brings; without triangles it is not shown."""
    mesh = shown.mesh
    item.setVisible(len(mesh.faces) > 0)
    if len(mesh.faces) == 0:
        return
    taken = MeshData(vertexes=mesh.vertices, faces=mesh.faces, vertexColors=colours)
    taken._vertexNormals = mesh.normals
    item.setMeshData(meshdata=taken)
