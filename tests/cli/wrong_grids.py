"""Wrong grids, meshes and methods. A part of wrong_inputs.py."""
import json

import kit
import netCDF4
import numpy as np
from cases import adjust, case, regrid


def grid_file(path, dims, variables, data_dims, **attributes):
    """Two days of a field on any grid. `variables`: name -> (dimensions, values, attributes)."""
    with netCDF4.Dataset(path, "w") as file:
        file.createDimension("time", 2)
        for name, size in dims.items():
            file.createDimension(name, size)
        time = file.createVariable("time", "f8", "time")
        time.units, time.calendar, time[:] = "days since 2001-01-01", "standard", [0.5, 1.5]
        for name, (own, values, attrs) in variables.items():
            v = file.createVariable(name, "f8" if np.asarray(values).dtype.kind == "f" else "i4", own)
            v.setncatts(attrs)
            v[...] = values
        data = file.createVariable("tas", "f4", ("time", *data_dims))
        data.units, data.standard_name = "K", "air_temperature"
        data.setncatts(attributes)
        data[:] = 280


LAT, LON = {"units": "degrees_north"}, {"units": "degrees_east"}


def two_dimensional(folder, lat):
    lon = np.tile([10.0, 11, 12, 13], (4, 1))
    grid_file(folder("in/tas.nc"), {"y": 4, "x": 4}, {"lat": (("y", "x"), lat, LAT), "lon": (("y", "x"), lon, LON)},
              ("y", "x"), coordinates="lat lon")
    folder.write("job.toml", kit.job())


@case("2-D coordinates with a gap of 71 degrees", 65,
      "windrow: FOLDER/in/tas.nc: corners cannot be inferred: the centres at row 0, column 0 and row 1, column "
      "0 (from 0) are 71 degrees apart (half of all neighbours: below 1); add bounds to the coordinates of "
      "'tas', or name a file that has them with grid = { coordinates = \"...\" } in the [[run]]\n")
def _(folder):
    two_dimensional(folder, np.repeat([[-31.0], [40], [41], [42]], 4, axis=1))


@case("2-D coordinates of unlike shapes", 65,
      "windrow: FOLDER/in/tas.nc: variable 'tas': dimension 'y' has no coordinate variable, so its values are "
      "not known\n")
def _(folder):
    grid_file(folder("in/tas.nc"), {"y": 4, "x": 4, "z": 3},
              {"lat": (("y", "z"), np.ones((4, 3)), LAT), "lon": (("y", "x"), np.ones((4, 4)), LON)}, ("y", "x"),
              coordinates="lat lon")
    folder.write("job.toml", kit.job())


def axes_in_metres(folder, run='files = ["in/tas*.nc"]\n', mapping=None):
    x = np.arange(4) * 1e5
    coordinates = {"y": ("y", x, {"units": "m", "standard_name": "projection_y_coordinate"}),
                   "x": ("x", x, {"units": "m", "standard_name": "projection_x_coordinate"})}
    if mapping is not None:
        coordinates["crs"] = ((), 0, mapping)
    grid_file(folder("in/tas.nc"), {"y": 4, "x": 4}, coordinates, ("y", "x"),
              **({} if mapping is None else {"grid_mapping": "crs"}))
    folder.write("job.toml", kit.job(run=run))


@case("projected axes without a grid mapping", 65,
      "windrow: FOLDER/in/tas.nc: variable 'tas': 'x' and 'y' are axes of a projection, but no grid mapping "
      "says which; add grid = { crs = \"...\" } to the [[run]]\n")
def _(folder):
    axes_in_metres(folder)


@case("grid mapping that lacks a parameter", 65,
      "note: FOLDER/in/tas.nc: time has no bounds; each value is taken for the day that contains its time\n"
      "windrow: FOLDER/in/tas.nc: grid mapping 'lambert_conformal_conic' has no standard_parallel; add grid = "
      "{ crs = \"...\" } to the [[run]]\n")
def _(folder):
    axes_in_metres(folder, mapping={"grid_mapping_name": "lambert_conformal_conic", "earth_radius": 6371000.0})


@case("grid mapping nobody knows", 65,
      "note: FOLDER/in/tas.nc: time has no bounds; each value is taken for the day that contains its time\n"
      "windrow: FOLDER/in/tas.nc: grid mapping 'lambert_conform_conic' is no projection that CF names; did you "
      "mean 'lambert_conformal_conic'?\n")
def _(folder):
    axes_in_metres(folder, mapping={"grid_mapping_name": "lambert_conform_conic", "earth_radius": 6371000.0})


@case("grid mapping without the earth's shape", 65,
      "note: FOLDER/in/tas.nc: time has no bounds; each value is taken for the day that contains its time\n"
      "windrow: FOLDER/in/tas.nc: grid mapping 'lambert_azimuthal_equal_area' does not say the earth's shape "
      "(earth_radius, or semi_major_axis with inverse_flattening or semi_minor_axis); add grid = { crs = "
      "\"...\" } to the [[run]]\n")
def _(folder):
    axes_in_metres(folder, mapping={"grid_mapping_name": "lambert_azimuthal_equal_area",
                                    "latitude_of_projection_origin": 48.0, "longitude_of_projection_origin": 10.0})


@case("CRS of the job's hint unknown", 78,
      "note: FOLDER/in/tas.nc: time has no bounds; each value is taken for the day that contains its time\n"
      "windrow: FOLDER/in/tas.nc: PROJ does not know the coordinate reference system 'EPSG:999999'; expected a "
      "code such as \"EPSG:3035\", a PROJ string with +proj=, or WKT\n")
def _(folder):
    axes_in_metres(folder, run='files = ["in/tas*.nc"]\ngrid = { crs = "EPSG:999999" }\n')


@case("rotated axes without a pole", 65,
      "windrow: FOLDER/in/tas.nc: variable 'tas': 'rlat' and 'rlon' are axes of a rotated grid, but no grid "
      "mapping says where its pole stands; add grid = { pole = [LONGITUDE, LATITUDE] } to the [[run]]\n")
def _(folder):
    v = np.arange(4.0)
    grid_file(folder("in/tas.nc"), {"rlat": 4, "rlon": 4},
              {"rlat": ("rlat", v, {"standard_name": "grid_latitude", "units": "degrees"}),
               "rlon": ("rlon", v, {"standard_name": "grid_longitude", "units": "degrees"})}, ("rlat", "rlon"))
    folder.write("job.toml", kit.job())


def faces(folder, nodes, location="face"):
    grid_file(folder("in/tas.nc"), {"node": 4, "face": 2, "three": 3},
              {"mesh": ((), 0, {"cf_role": "mesh_topology", "topology_dimension": np.int32(2),
                                "node_coordinates": "node_lon node_lat", "face_node_connectivity": "face_nodes"}),
               "node_lon": ("node", np.array([10.0, 20, 20, 10]), LON),
               "node_lat": ("node", np.array([40.0, 40, 50, 50]), LAT),
               "face_nodes": (("face", "three"), np.array(nodes, "i4"), {"cf_role": "face_node_connectivity"})},
              ("face",), mesh="mesh", location=location)
    folder.write("job.toml", kit.job())


@case("UGRID node out of range", 65,
      "windrow: FOLDER/in/tas.nc: variable 'tas': face 1 of 'face_nodes' (counted from 0) has 2 nodes; at "
      "least 3 were expected\n")
def _(folder):
    faces(folder, [[0, 1, 2], [0, 2, 7]])


@case("UGRID face of two nodes", 65,
      "windrow: FOLDER/in/tas.nc: variable 'tas': face 1 of 'face_nodes' (counted from 0) has 2 nodes; at "
      "least 3 were expected\n")
def _(folder):
    faces(folder, [[0, 1, 2], [0, 2, -1]])


@case("UGRID data on edges", 65,
      "windrow: FOLDER/in/tas.nc: variable 'tas': at the edges of mesh 'mesh'; only data at faces have an area "
      "and can be read\n")
def _(folder):
    faces(folder, [[0, 1, 2], [0, 2, 3]], location="edge")


def healpix(folder, cells, **mapping):
    grid_file(folder("in/tas.nc"), {"cell": cells}, {"crs": ((), 0, {"grid_mapping_name": "healpix", **mapping})},
              ("cell",), grid_mapping="crs")
    folder.write("job.toml", kit.job())


@case("HEALPix scheme unknown", 65,
      "windrow: FOLDER/in/tas.nc: variable 'tas': grid mapping 'crs' has the indexing_scheme 'morton'; nested, "
      "ring, nested_unique or zuniq was expected\n")
def _(folder):
    healpix(folder, 48, refinement_level=np.int32(1), indexing_scheme="morton")


@case("HEALPix with too few cells", 65,
      "windrow: FOLDER/in/tas.nc: variable 'tas': on a HEALPix grid of level 1 without healpix_index, but no "
      "dimension has the length 48 of all its cells\n")
def _(folder):
    healpix(folder, 47, refinement_level=np.int32(1), indexing_scheme="nested")


@case("stations for a conservative method", 65,
      "note: FOLDER/in/tas.nc: time has no bounds; each value is taken for the day that contains its time\n"
      "windrow: 3 points: have no area, which conservative methods need; expected method bilinear or nearest, "
      "or grid = { coordinates = \"...\" } naming a file with the cells' corners\n")
def _(folder):
    grid_file(folder("in/tas.nc"), {"station": 3}, {"lat": ("station", np.array([40.0, 45, 50]), LAT),
                                                     "lon": ("station", np.array([10.0, 15, 20]), LON)}, ("station",),
              coordinates="lat lon")
    folder.write("job.toml", kit.job())


# --- meshes -----------------------------------------------------------------------------------------------------------

def polygons(folder, features, keys=""):
    """Catchments from GeoJSON: a list of (properties, rings)."""
    with open(folder("in/basins.geojson"), "w") as file:
        json.dump({"type": "FeatureCollection", "features": [
            {"type": "Feature", "properties": properties, "geometry": {"type": "Polygon", "coordinates": rings}}
            for properties, rings in features]}, file)
    regrid(folder, mesh=f'[mesh]\nkind = "catchments"\npolygons = "in/basins.geojson"\n{keys}')


SQUARE = [[[10, 40], [20, 40], [20, 50], [10, 50], [10, 40]]]
BOW = [[[10, 40], [20, 50], [20, 40], [10, 50], [10, 40]]]


@case("catchments missing", 66,
      "windrow: FOLDER/in/basins.gpkg: no such file\n")
def _(folder):
    regrid(folder, mesh='[mesh]\nkind = "catchments"\npolygons = "in/basins.gpkg"\n')


@case("catchments' id column unknown", 66,
      "windrow: FOLDER/in/basins.geojson: layer 'basins' has no column 'cod'; did you mean 'code'?\n")
def _(folder):
    polygons(folder, [({"code": "a"}, SQUARE)], 'id = "cod"\n')


@case("catchments with one id twice", 65,
      "windrow: FOLDER/in/basins.geojson: feature 2 of layer 'basins' has the id 'a' of feature 1; expected "
      "ids of their own, or another column\n")
def _(folder):
    polygons(folder, [({"code": "a"}, SQUARE), ({"code": "a"}, SQUARE)], 'id = "code"\n')


@case("catchment that crosses itself", 65,
      "windrow: FOLDER/in/basins.geojson: feature 1 of layer 'basins' is not valid (Self-intersection at or "
      "near point 15 45); mend the polygon\n")
def _(folder):
    polygons(folder, [({"code": "a"}, BOW)], 'id = "code"\n')


@case("towns without coordinates", 65,
      "windrow: FOLDER/in/towns.csv: names no town with coordinates\n")
def _(folder):
    folder.write("in/towns.csv", "station,longitude,latitude\nA,,\n")
    regrid(folder, mesh='[mesh]\nkind = "towns"\nsites = "in/towns.csv"\n')


@case("mesh file without the variable", 65,
      "windrow: FOLDER/in/tas.nc: no variable 'tass'; did you mean 'tas'? (data variables in the file: tas)\n")
def _(folder):
    regrid(folder, mesh='[mesh]\nkind = "file"\nfrom = "in/tas.nc"\nvariable = "tass"\n')


@case("faces from a file without faces", 65,
      "windrow: FOLDER/in/tas.nc: holds no UGRID faces; expected a mesh topology, or mesh kind \"file\"\n")
def _(folder):
    regrid(folder, mesh='[mesh]\nkind = "faces"\nfrom = "in/tas.nc"\n')


@case("raster template missing", 66,
      "windrow: FOLDER/in/grid.tif: no such file\n")
def _(folder):
    regrid(folder, mesh='[mesh]\nkind = "raster"\ntemplate = "in/grid.tif"\n')


@case("mask that leaves nothing", 65,
      "windrow: FOLDER/in/land.geojson: the mask leaves no cell of the mesh\n")
def _(folder):
    with open(folder("in/land.geojson"), "w") as file:
        json.dump({"type": "Feature", "properties": {}, "geometry": {"type": "Polygon", "coordinates":
                  [[[-60, 0], [-50, 0], [-50, 10], [-60, 0]]]}}, file)
    regrid(folder, mesh=kit.MESH + 'mask = "in/land.geojson"\n')


# --- methods ----------------------------------------------------------------------------------------------------------

@case("smooth interpolation with land fractions", 78,
      "windrow: field 'tas', run 'run': method conservative-smooth takes no land_fraction: integrals over "
      "parts of cells cannot be restored; expected conservative-1 or conservative-2\n")
def _(folder):
    kit.fixed(folder("in/land.nc"), "sftlf", "land_area_fraction", "1", 0.5)
    regrid(folder, run='files = ["in/tas*.nc"]\nland_fraction = "in/land.nc"\n',
           field='variable = "tas"\nmethod = "conservative-smooth"\n')


@case("commonest category adjusted", 78,
      "windrow: FOLDER/job.toml:5:10: 'majority' is for categories, which cannot be adjusted to stations; "
      "expected another method, or no [field.adjust]\n"
      "method = \"majority\"\n"
      "         ^\n")
def _(folder):
    adjust(folder, field='variable = "tas"\nmethod = "majority"\n[field.adjust]\nmethod = "mean-shift"\n')
