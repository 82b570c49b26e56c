//! A field as an indexed PNG in a data URI. Entry 0 is transparent: no value there.

use base64::Engine;
use base64::engine::general_purpose::STANDARD;

use super::DrawError;
use super::colour::{Limit, Rgb};
use super::field::Field;

/// Renders `width` by `height` pixels; `column(k)` and `row(k)` give the sample position of the
/// centre of pixel column or row `k`, rows from the top.
pub(super) fn data_uri(
    field: &Field,
    limit: &Limit,
    palette: &[Rgb],
    (width, height): (usize, usize),
    column: impl Fn(usize) -> f64,
    row: impl Fn(usize) -> f64,
) -> Result<String, DrawError> {
    let columns: Vec<f64> = (0..width).map(column).collect();
    let mut pixels = Vec::with_capacity(width * height);
    for k in 0..height {
        let v = row(k);
        pixels.extend(columns.iter().map(|&u| match field.at(u, v) {
            None => 0u8,
            Some(value) => u8::try_from(limit.entry(value) + 1).unwrap_or(u8::MAX),
        }));
    }
    image_uri(&pixels, palette, width, height)
}

/// An image of palette entries counted from one, by rows from the top, as a data URI.
pub(super) fn image_uri(
    pixels: &[u8],
    palette: &[Rgb],
    width: usize,
    height: usize,
) -> Result<String, DrawError> {
    let bytes =
        encode(pixels, palette, width, height).map_err(|e| DrawError::Image(e.to_string()))?;
    Ok(format!("data:image/png;base64,{}", STANDARD.encode(bytes)))
}

fn encode(
    pixels: &[u8],
    palette: &[Rgb],
    width: usize,
    height: usize,
) -> Result<Vec<u8>, Box<dyn std::error::Error>> {
    let mut bytes = Vec::new();
    let mut encoder = png::Encoder::new(&mut bytes, u32::try_from(width)?, u32::try_from(height)?);
    encoder.set_color(png::ColorType::Indexed);
    encoder.set_depth(png::BitDepth::Eight);
    encoder.set_palette(
        [[255u8; 3]]
            .iter()
            .chain(palette)
            .flatten()
            .copied()
            .collect::<Vec<_>>(),
    );
    encoder.set_trns(vec![0u8]);
    encoder.set_compression(png::Compression::High);
    encoder.set_filter(png::Filter::Up);
    let mut writer = encoder.write_header()?;
    writer.write_image_data(pixels)?;
    writer.finish()?;
    Ok(bytes)
}
