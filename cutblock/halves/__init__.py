"""The two volumes of each sweep: litres, masses and closed meshes."""
