//! Colours for light paper and dark screens, and the style sheet that a figure needs.
//!
//! Three hues carry series: deep blue, ochre and plum. They differ in lightness as well as in hue, so
//! that they stay apart for every kind of colour vision and in grey print; no reading rests on
//! colour alone, each series also has its shape, its hatch or its words. None of them means good or
//! bad. The tests compute contrast ratios (WCAG 2.2) and distances as seen with each kind of
//! dichromacy (matrices of Machado, Oliveira & Fernandes 2009, distance in OKLab, Ottosson 2020).
//!
//! | against the page | light | dark |
//! | --- | --- | --- |
//! | ink (text) | 14.1 | 14.8 |
//! | soft (text) | 6.8 | 8.5 |
//! | deep | 4.7 | 9.4 |
//! | ochre | 3.5 | 9.9 |
//! | plum | 12.2 | 3.8 |
//!
//! Text keeps 4.5 or more; marks keep 3 or more.

/// Colours of one theme, as `#rrggbb`.
#[derive(Debug, Clone, Copy)]
pub struct Theme {
    /// The page.
    pub page: &'static str,
    /// Cards and table heads on the page.
    pub raised: &'static str,
    /// Text and axes.
    pub ink: &'static str,
    /// Text of lesser weight.
    pub soft: &'static str,
    /// Lines of a grid: no reading rests on them.
    pub faint: &'static str,
    /// First series.
    pub deep: &'static str,
    /// Second series.
    pub ochre: &'static str,
    /// Third series.
    pub plum: &'static str,
    /// Cells of a matrix from the smallest to the largest value; ink is read on each.
    pub steps: [&'static str; 5],
}

/// On light ground and on paper.
pub const LIGHT: Theme = Theme {
    page: "#fbfaf6",
    raised: "#f1efe7",
    ink: "#1d2a30",
    soft: "#4d5a60",
    faint: "#d5d3c8",
    deep: "#1f77ad",
    ochre: "#b57b08",
    plum: "#5e0f4a",
    steps: ["#fbfaf6", "#e0e9ec", "#c3d9e4", "#a6c9dc", "#8ab9d4"],
};

/// On dark ground.
pub const DARK: Theme = Theme {
    page: "#12191d",
    raised: "#1b2429",
    ink: "#e6ebec",
    soft: "#a9b5ba",
    faint: "#344148",
    deep: "#7cc4f5",
    ochre: "#f0b93a",
    plum: "#b24f9b",
    steps: ["#12191d", "#1a2c37", "#213d4f", "#284c64", "#2f5a77"],
};

impl Theme {
    fn variables(&self) -> String {
        let [s0, s1, s2, s3, s4] = self.steps;
        format!(
            "--page:{};--raised:{};--ink:{};--soft:{};--faint:{};--deep:{};--ochre:{};--plum:{};\
             --step-0:{s0};--step-1:{s1};--step-2:{s2};--step-3:{s3};--step-4:{s4}",
            self.page,
            self.raised,
            self.ink,
            self.soft,
            self.faint,
            self.deep,
            self.ochre,
            self.plum
        )
    }
}

/// The colours of both themes as custom properties of `selector`; paper is always light.
pub fn theme_style(selector: &str) -> String {
    format!(
        "{selector}{{color-scheme:light dark;{}}}\n\
         @media screen and (prefers-color-scheme:dark){{{selector}{{{}}}}}\n",
        LIGHT.variables(),
        DARK.variables()
    )
}

/// What the classes of a drawing look like. Colours come from the custom properties.
pub const FIGURE_STYLE: &str = include_str!("figure.css");

#[cfg(test)]
mod tests {
    use super::*;

    fn linear(colour: &str) -> [f64; 3] {
        [1, 3, 5].map(|i| {
            let x = f64::from(u8::from_str_radix(&colour[i..i + 2], 16).unwrap()) / 255.0;
            if x <= 0.040_45 {
                x / 12.92
            } else {
                ((x + 0.055) / 1.055).powf(2.4)
            }
        })
    }

    /// Contrast ratio of WCAG 2.2.
    fn contrast(a: &str, b: &str) -> f64 {
        let luminance = |c| {
            let [r, g, b] = linear(c);
            0.2126 * r + 0.7152 * g + 0.0722 * b + 0.05
        };
        let (a, b) = (luminance(a), luminance(b));
        a.max(b) / a.min(b)
    }

    type Matrix = [[f64; 3]; 3];
    /// Severity 1 of Machado, Oliveira & Fernandes (2009), Table 1: prot-, deuter-, tritanopia.
    const VISION: [Matrix; 4] = [
        [[1.0, 0.0, 0.0], [0.0, 1.0, 0.0], [0.0, 0.0, 1.0]],
        [
            [0.152286, 1.052583, -0.204868],
            [0.114503, 0.786281, 0.099216],
            [-0.003882, -0.048116, 1.051998],
        ],
        [
            [0.367322, 0.860646, -0.227968],
            [0.280085, 0.672501, 0.047413],
            [-0.011820, 0.042940, 0.968881],
        ],
        [
            [1.255528, -0.076749, -0.178779],
            [-0.078411, 0.930809, 0.147602],
            [0.004733, 0.691367, 0.303900],
        ],
    ];

    fn apply(m: &Matrix, v: [f64; 3]) -> [f64; 3] {
        m.map(|row| row[0] * v[0] + row[1] * v[1] + row[2] * v[2])
    }

    /// OKLab of a colour as seen (Ottosson 2020).
    fn seen(colour: &str, vision: &Matrix) -> [f64; 3] {
        let rgb = apply(vision, linear(colour)).map(|x| x.clamp(0.0, 1.0));
        let cones = [
            [0.4122214708, 0.5363325363, 0.0514459929],
            [0.2119034982, 0.6806995451, 0.1073969566],
            [0.0883024619, 0.2817188376, 0.6299787005],
        ];
        let lab = [
            [0.2104542553, 0.7936177850, -0.0040720468],
            [1.9779984951, -2.4285922050, 0.4505937099],
            [0.0259040371, 0.7827717662, -0.8086757660],
        ];
        apply(&lab, apply(&cones, rgb).map(f64::cbrt))
    }

    #[test]
    fn text_and_marks_stand_out() {
        // The ratio of black on white is 21 by definition.
        assert!((contrast("#000000", "#ffffff") - 21.0).abs() < 1e-9);
        for theme in [LIGHT, DARK] {
            for ground in [theme.page, theme.raised] {
                assert!(contrast(theme.ink, ground) >= 7.0);
                assert!(contrast(theme.soft, ground) >= 4.5);
                for mark in [theme.deep, theme.ochre, theme.plum] {
                    assert!(contrast(mark, ground) >= 3.0, "{mark} on {ground}");
                }
            }
            for step in theme.steps {
                assert!(contrast(theme.ink, step) >= 4.5, "{step}");
            }
        }
    }

    #[test]
    fn series_stay_apart_for_every_colour_vision() {
        for theme in [LIGHT, DARK] {
            let series = [theme.deep, theme.ochre, theme.plum];
            for vision in &VISION {
                for (i, a) in series.iter().enumerate() {
                    for b in &series[..i] {
                        let (a3, b3) = (seen(a, vision), seen(b, vision));
                        let distance = (0..3).map(|k| (a3[k] - b3[k]).powi(2)).sum::<f64>().sqrt();
                        // 0.02 is about the least difference that is seen side by side.
                        assert!(distance >= 0.2, "{a} {b} {distance}");
                    }
                }
            }
        }
    }
}
