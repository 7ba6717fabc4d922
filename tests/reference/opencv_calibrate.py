"""Reference values for calibrating a camera: OpenCV's calibrateCamera on fixed points of a plane.

Prints JSON. `tests/data/opencv_calibrate.json` is this output, kept; tests/calibration.rs solves the same points with our own
calibration and, where Python is at hand, runs this script again.

    python tests/reference/opencv_calibrate.py > tests/data/opencv_calibrate.json

Needs: numpy, opencv-python-headless. Written with OpenCV 5.0.0.
"""

import json
import sys

import cv2
import numpy as np

SIZE = (2000, 1500)
FLAGS = cv2.CALIB_FIX_ASPECT_RATIO | cv2.CALIB_FIX_K3
EPS = (cv2.TERM_CRITERIA_COUNT + cv2.TERM_CRITERIA_EPS, 1000, 1e-15)

# name, f, cx, cy, (k1, k2, p1, p2), noise px, seed, rotation vectors and translations of the views
TILTS = [(0.5, 0.1, 0.0), (-0.45, 0.05, 0.1), (0.05, 0.55, -0.1), (0.0, -0.5, 0.05), (0.35, 0.35, 0.7), (-0.3, 0.4, -0.4), (0.05, -0.02, 1.5)]
CASES = [
    ("seven views, moderate lens", 2300.0, 1013.0, 741.0, (-0.12, 0.05, 8e-4, -5e-4), 0.05, 1, TILTS),
    ("four views, barrel", 1600.0, 985.0, 760.0, (-0.25, 0.09, -3e-4, 1e-3), 0.1, 2, TILTS[:4]),
    ("twelve views, long lens", 4800.0, 1004.0, 752.0, (0.02, -0.1, 2e-4, 2e-4), 0.02, 3, TILTS + [(0.2, 0.6, 0.3), (0.6, -0.2, 0.1), (-0.6, 0.1, 0.0), (0.3, -0.4, 2.0), (-0.2, -0.5, 3.0)]),
]


def case(name, focal_px, cx, cy, distortion, noise_px, seed, turns):
    random = np.random.default_rng(seed)
    plane = np.array([[x, y, 0.0] for y in np.arange(-4, 5) * 0.0175 for x in np.arange(-5, 6) * 0.018])
    matrix = np.array([[focal_px, 0, cx], [0, focal_px, cy], [0, 0, 1.0]])
    distance = 0.25 * focal_px / 1000
    views = []
    for turn in turns:
        # the print's Y runs up, the camera's y down
        rotation = cv2.Rodrigues(np.array(turn))[0] @ np.diag([1.0, -1.0, -1.0])
        place = np.array([random.uniform(-0.01, 0.01), random.uniform(-0.01, 0.01), distance * random.uniform(0.95, 1.15)])
        pixels = cv2.projectPoints(plane, cv2.Rodrigues(rotation)[0], place, matrix, np.array(distortion))[0].reshape(-1, 2)
        inside = (pixels > 5).all(1) & (pixels[:, 0] < SIZE[0] - 5) & (pixels[:, 1] < SIZE[1] - 5)
        views.append((plane[inside], pixels[inside] + noise_px * random.standard_normal((int(inside.sum()), 2))))
    # OpenCV takes points in single precision: what it gets is what is kept.
    objects = [p.astype(np.float32) for p, _ in views]
    images = [q.astype(np.float32) for _, q in views]
    start = np.array([[focal_px * 1.1, 0, SIZE[0] / 2], [0, focal_px * 1.1, SIZE[1] / 2], [0, 0, 1.0]])
    rms, found, lens, _, _, deviations, _, per_view = cv2.calibrateCameraExtended(
        objects, images, SIZE, start, None, flags=FLAGS | cv2.CALIB_USE_INTRINSIC_GUESS, criteria=EPS)
    lens, deviations = lens.ravel(), deviations.ravel()
    names = ["focal length", "principal point x", "principal point y", "distortion k1", "distortion k2", "distortion p1", "distortion p2"]
    values = [found[0, 0], found[0, 2], found[1, 2], *lens[:4]]
    # with a fixed aspect ratio OpenCV gives f_y its deviation; f_x then has none
    u = [max(deviations[0], deviations[1]), *deviations[2:8]]
    return {
        "name": name, "size_px": list(SIZE), "noise_px": noise_px, "rms_px": rms,
        "true": [focal_px, cx, cy, *distortion],
        "parameters": [{"name": n, "value": float(v), "u": float(s)} for n, v, s in zip(names, values, u)],
        "per_view_rms_px": per_view.ravel().tolist(),
        "views": [{"plane_m": o[:, :2].astype(float).tolist(), "pixels_px": i.astype(float).tolist()} for o, i in zip(objects, images)],
    }


def main():
    result = {
        "library": "opencv-python-headless", "version": cv2.__version__, "numpy": np.__version__,
        "script": "tests/reference/opencv_calibrate.py", "cases": [case(*c) for c in CASES],
    }
    json.dump(result, sys.stdout)
    print()


if __name__ == "__main__":
    main()
