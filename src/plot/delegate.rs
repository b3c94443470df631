//! The methods that our two back ends hand on to the library's unchanged.

/// Hands everything but size and text on to the back end in field 0.
macro_rules! delegate_shapes {
    () => {
        fn ensure_prepared(
            &mut self,
        ) -> std::result::Result<(), DrawingErrorKind<Self::ErrorType>> {
            self.0.ensure_prepared()
        }

        fn present(&mut self) -> std::result::Result<(), DrawingErrorKind<Self::ErrorType>> {
            self.0.present()
        }

        fn draw_pixel(
            &mut self,
            at: BackendCoord,
            colour: BackendColor,
        ) -> std::result::Result<(), DrawingErrorKind<Self::ErrorType>> {
            self.0.draw_pixel(at, colour)
        }

        fn draw_line<S: BackendStyle>(
            &mut self,
            from: BackendCoord,
            to: BackendCoord,
            style: &S,
        ) -> std::result::Result<(), DrawingErrorKind<Self::ErrorType>> {
            self.0.draw_line(from, to, style)
        }

        fn draw_rect<S: BackendStyle>(
            &mut self,
            from: BackendCoord,
            to: BackendCoord,
            style: &S,
            fill: bool,
        ) -> std::result::Result<(), DrawingErrorKind<Self::ErrorType>> {
            self.0.draw_rect(from, to, style, fill)
        }

        fn draw_path<S: BackendStyle, I: IntoIterator<Item = BackendCoord>>(
            &mut self,
            path: I,
            style: &S,
        ) -> std::result::Result<(), DrawingErrorKind<Self::ErrorType>> {
            self.0.draw_path(path, style)
        }

        fn draw_circle<S: BackendStyle>(
            &mut self,
            centre: BackendCoord,
            radius: u32,
            style: &S,
            fill: bool,
        ) -> std::result::Result<(), DrawingErrorKind<Self::ErrorType>> {
            self.0.draw_circle(centre, radius, style, fill)
        }

        fn fill_polygon<S: BackendStyle, I: IntoIterator<Item = BackendCoord>>(
            &mut self,
            path: I,
            style: &S,
        ) -> std::result::Result<(), DrawingErrorKind<Self::ErrorType>> {
            self.0.fill_polygon(path, style)
        }
    };
}
