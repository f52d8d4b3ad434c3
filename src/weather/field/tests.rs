use super::*;

fn place(lat_deg: f64, lon_deg: f64) -> Place {
    Place::new(lat_deg, lon_deg).unwrap()
}

fn grid(lats_deg: &[f64], lons_deg: &[f64], values: Vec<f32>) -> Field {
    let mut field = Field::new(Space::Grid { lats_deg: lats_deg.to_vec(), lons_deg: lons_deg.to_vec() }, None).unwrap();
    field.insert(Quantity::Temperature, Series { times: Times::Instants(vec![0]), values }).unwrap();
    field
}

#[test]
fn a_point_speaks_for_fifty_kilometres_and_not_beyond() {
    let mut field = Field::new(Space::Point(place(60.0, 179.9)), None).unwrap();
    let series = Series { times: Times::Instants(vec![0, 3600]), values: vec![10.0, 20.0] };
    field.insert(Quantity::Temperature, series).unwrap();
    assert_eq!(field.at(Quantity::Temperature, place(60.0, 179.9), 900), Some(12.5));
    // One degree of latitude is 111.2 km on the sphere: 0.44 degrees are 48.9 km, 0.46 are 51.1 km.
    assert_eq!(field.at(Quantity::Temperature, place(60.44, 179.9), 0), Some(10.0));
    assert_eq!(field.at(Quantity::Temperature, place(60.46, 179.9), 0), None);
    // Across the date line: 0.8 degrees of longitude at 60 degrees north are 44.5 km.
    assert_eq!(field.at(Quantity::Temperature, place(60.0, -179.3), 0), Some(10.0));
    assert_eq!(field.at(Quantity::Temperature, place(60.0, 179.9), -1), None);
    assert_eq!(field.at(Quantity::Temperature, place(60.0, 179.9), 3601), None);
}

#[test]
fn directions_are_averaged_round_north() {
    let mut field = Field::new(Space::Point(place(0.0, 0.0)), None).unwrap();
    let series = Series { times: Times::Instants(vec![0, 3600, 7200]), values: vec![350.0, 10.0, 190.0] };
    field.insert(Quantity::WindFrom, series).unwrap();
    let north = field.at(Quantity::WindFrom, place(0.0, 0.0), 1800).unwrap();
    assert!(north.min(360.0 - north) < 0.01, "{north}");
    assert_eq!(field.at(Quantity::WindFrom, place(0.0, 0.0), 5400), None, "opposite directions have no mean");
}

#[test]
fn a_grid_is_bilinear_speaks_half_a_cell_further_and_closes_round_the_globe() {
    let field = grid(&[50.0, 51.0], &[10.0, 11.0], vec![0.0, 10.0, 20.0, 30.0]);
    assert_eq!(field.at(Quantity::Temperature, place(50.5, 10.5), 0), Some(15.0));
    assert_eq!(field.at(Quantity::Temperature, place(49.6, 10.0), 0), Some(0.0));
    assert_eq!(field.at(Quantity::Temperature, place(49.4, 10.0), 0), None);
    let globe = grid(&[0.0], &[0.0, 90.0, 180.0, 270.0], vec![0.0, 1.0, 2.0, 3.0]);
    assert_eq!(globe.at(Quantity::Temperature, place(0.0, -45.0), 0), Some(1.5));
}

#[test]
fn a_missing_neighbour_makes_the_value_missing_unless_it_has_no_weight() {
    let field = grid(&[0.0, 1.0], &[0.0, 1.0], vec![1.0, f32::NAN, 1.0, 1.0]);
    assert_eq!(field.at(Quantity::Temperature, place(0.0, 0.0), 0), Some(1.0));
    assert_eq!(field.at(Quantity::Temperature, place(0.1, 0.1), 0), None);
}

#[test]
fn series_that_do_not_fit_are_refused() {
    let mut field = Field::new(Space::Point(place(0.0, 0.0)), None).unwrap();
    let refuse = |field: &mut Field, times, values: &[f32]| {
        field.insert(Quantity::Rain, Series { times, values: values.to_vec() }).unwrap_err()
    };
    assert_eq!(refuse(&mut field, Times::Instants(vec![]), &[]), FieldError::Empty("rain"));
    assert_eq!(refuse(&mut field, Times::Instants(vec![5, 5]), &[0.0, 0.0]), FieldError::Order("rain"));
    assert_eq!(refuse(&mut field, Times::Periods(vec![0..10, 9..20]), &[0.0, 0.0]), FieldError::Order("rain"));
    assert!(matches!(refuse(&mut field, Times::Instants(vec![5]), &[0.0, 1.0]), FieldError::Shape { .. }));
    let reversed = Space::Grid { lats_deg: vec![2.0, 1.0], lons_deg: vec![0.0] };
    assert_eq!(Field::new(reversed, None).unwrap_err(), FieldError::Axis("latitude"));
}
