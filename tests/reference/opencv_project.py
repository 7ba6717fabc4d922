"""Reference vectors for the camera: OpenCV's projectPoints, Rodrigues and findHomography on fixed cases.

Prints JSON. `tests/data/opencv_project.json` is this output, kept; tests/opencv.rs compares our camera with it and,
where Python is at hand, runs this script again.

    python tests/reference/opencv_project.py > tests/data/opencv_project.json

Needs: numpy, opencv-python-headless. Written with OpenCV 5.0.0.
"""

import json
import sys

import cv2
import numpy as np

# points on and off the plane of the print, metres
PLANE = [[x, y, 0.0] for y in (-0.12, 0.0, 0.12) for x in (-0.16, 0.0, 0.16)]
OFF_PLANE = [[0.05, -0.03, 0.04], [-0.08, 0.06, -0.05]]

# name, f, cx, cy, (k1, k2, p1, p2), rotation vector (print -> camera), translation
CAMERAS = [
    ("square-on, no distortion", 3000.0, 2000.0, 1500.0, (0, 0, 0, 0), (0, 0, 0), (0, 0, 0.6)),
    ("y flipped, as a print is seen", 3000.0, 1999.5, 1499.5, (0, 0, 0, 0), (np.pi - 1e-3, 0, 0), (0.01, 0.02, 0.6)),
    ("barrel", 2800.0, 2010.0, 1490.0, (-0.12, 0.03, 0, 0), (0.1, -0.2, 0.05), (-0.02, 0.01, 0.55)),
    ("pincushion", 3100.0, 1990.0, 1510.0, (0.09, -0.02, 0, 0), (-0.15, 0.1, -0.3), (0.0, 0.03, 0.7)),
    ("tangential only", 2900.0, 2000.0, 1500.0, (0, 0, 1.5e-3, -2.5e-3), (0.3, 0.2, 0.1), (0.02, -0.01, 0.6)),
    ("everything, steep", 2600.0, 2031.25, 1472.75, (-0.2, 0.08, 8e-4, 1.1e-3), (0.7, -0.4, 0.9), (0.05, -0.04, 0.5)),
    ("tiny turn", 3000.0, 2000.0, 1500.0, (-0.05, 0.01, 1e-4, -1e-4), (1e-9, -2e-9, 3e-9), (0, 0, 0.6)),
    ("turn of 3 rad", 3000.0, 2000.0, 1500.0, (-0.05, 0.01, 1e-4, -1e-4), (2.9, 0.5, -0.6), (0.01, 0, 0.8)),
    ("short focal length", 900.0, 640.0, 360.0, (-0.28, 0.07, 2e-4, 1e-4), (-0.2, 0.3, 1.4), (0.0, 0.02, 0.4)),
]


def camera_case(name, focal_px, cx, cy, distortion, turn, place):
    points = np.array(PLANE + OFF_PLANE)
    matrix = np.array([[focal_px, 0, cx], [0, focal_px, cy], [0, 0, 1.0]])
    turn, place = np.array(turn, float), np.array(place, float)
    pixels, _ = cv2.projectPoints(points, turn, place, matrix, np.array(distortion, float))
    rotation, _ = cv2.Rodrigues(turn)
    return {
        "name": name, "focal_px": focal_px, "principal_px": [cx, cy],
        "k1": float(distortion[0]), "k2": float(distortion[1]), "p1": float(distortion[2]), "p2": float(distortion[3]),
        "turn_rad": turn.tolist(), "place_m": place.tolist(), "rotation": rotation.tolist(),
        "points_m": points.tolist(), "pixels_px": pixels.reshape(-1, 2).tolist(),
    }


def homography_case(name, camera, noise_px):
    """Print to pixel; with noise the fit minimises the distances in the photo (method 0)."""
    _, focal_px, cx, cy, _, turn, place = camera
    grid = np.array([[x, y, 0.0] for y in np.linspace(-0.12, 0.12, 5) for x in np.linspace(-0.16, 0.16, 6)])
    matrix = np.array([[focal_px, 0, cx], [0, focal_px, cy], [0, 0, 1.0]])
    pixels = cv2.projectPoints(grid, np.array(turn, float), np.array(place, float), matrix, None)[0].reshape(-1, 2)
    pixels = pixels + noise_px * np.random.default_rng(20261201).standard_normal(pixels.shape)
    found, _ = cv2.findHomography(grid[:, :2], pixels, 0)
    mapped = cv2.perspectiveTransform(grid[None, :, :2], found)[0]
    return {
        "name": name, "noise_px": noise_px, "plane_m": grid[:, :2].tolist(), "pixels_px": pixels.tolist(),
        "homography": (found / found[2, 2]).tolist(), "rms_px": float(np.sqrt(((mapped - pixels) ** 2).sum(1).mean())),
    }


def main():
    result = {
        "library": "opencv-python-headless", "version": cv2.__version__, "numpy": np.__version__,
        "script": "tests/reference/opencv_project.py",
        "cameras": [camera_case(*camera) for camera in CAMERAS],
        "homographies": [
            homography_case("exact, steep", CAMERAS[5], 0.0),
            homography_case("exact, y flipped", CAMERAS[1], 0.0),
            homography_case("0.3 px noise", CAMERAS[2], 0.3),
        ],
    }
    json.dump(result, sys.stdout, indent=1)
    print()


if __name__ == "__main__":
    main()
