"""What a shape attracts: prisms, cylinders, spheres, polygons, passages, meshes, terrain."""
