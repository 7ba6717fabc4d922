//! In: directions, lattices, poses. Out: directions, screen points, pixels. Pure functions, generic over the number type.
//! Must never know: brightness, files, uncertainty.
//! Start reading at `order_direction`.
